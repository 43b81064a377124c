"""Figures that rest on withheld counts: fixed decimals, or withheld with them."""

import numpy as np
import pytest

from engine import indicators
from engine.estimates import Estimate, Reason
from server.results.loading import Loaded
from server.results.protecting import all_protected, protected, protected_batch, withheld_in
from tests.factories import GRIDS, gompertz_panel

PANEL = gompertz_panel()


def loaded(*ages: int, births: str = "") -> Loaded:
    held = frozenset([births]) if births else frozenset[str]()
    return Loaded(PANEL, "final", frozenset(ages), bool(ages or births), held)


def estimate(value: float) -> Estimate:
    none = np.array(Reason.NONE, np.uint8)
    return Estimate(*(np.array(one) for one in (value, value - 1, value + 1)), none, np.array(0.5))


@pytest.mark.parametrize(
    ("key", "ages", "gone"),
    [
        ("imr", (0,), True),
        ("imr", (1,), False),
        ("5q0", (0,), False),
        ("5q0", (0, 1), True),
        ("5q10", (10,), True),
        ("5q10", (15,), False),
        ("45q15", (15, 20), False),
        ("e0", (0, 1, 5), False),
    ],
)
def test_a_rate_of_withheld_ages_alone_is_withheld(
    key: str, ages: tuple[int, ...], gone: bool
) -> None:
    found = protected(key, estimate(12.3456), loaded(*ages))
    assert np.isnan(found.value) == gone
    assert (int(found.reason) == Reason.WITHHELD) == gone


def test_a_rate_over_withheld_births_is_withheld() -> None:
    found = protected("nmr", estimate(3.21), loaded(births="neonatal_deaths"))
    assert int(found.reason) == Reason.WITHHELD
    assert int(protected("imr", estimate(3.21), loaded(births="stillborn")).reason) == Reason.NONE


def test_other_figures_are_given_to_the_decimals_they_are_printed_with() -> None:
    unit = indicators.find("e0").unit
    found = protected("e0", estimate(81.23456), loaded(5))
    assert float(found.value) * unit.scale == round(81.23456 * unit.scale, unit.decimals)
    assert float(found.low) == round(80.23456, unit.decimals)
    untouched = protected("e0", estimate(81.23456), loaded())
    assert float(untouched.value) == 81.23456


def test_a_difference_is_protected_where_either_side_is() -> None:
    one, other = loaded(), loaded(0)
    assert int(protected("imr", estimate(1.0), one, other).reason) == Reason.WITHHELD
    assert all_protected({"e0": estimate(1.23456)}, one, other)["e0"].value == 1.2
    assert all_protected({"e0": estimate(1.23456)}, one)["e0"].value == 1.23456


def test_a_batch_is_protected_one_by_one() -> None:
    columns = (np.full(3, 0.0123456) for _part in range(3))
    many = Estimate(*columns, np.zeros(3, np.uint8), np.full(3, 0.1))
    one = indicators.find("imr")
    found = protected_batch(many, one, [[loaded()], [loaded(5)], [loaded(0)]])
    assert found.value[0] == 0.0123456
    assert found.value[1] == pytest.approx(0.0123)
    assert np.isnan(found.value[2])
    assert found.reason.tolist() == [Reason.NONE, Reason.NONE, Reason.WITHHELD]


def test_a_coarser_group_holds_a_withheld_one() -> None:
    grid = type(GRIDS["abridged"])((0, 5, 20))
    assert withheld_in(grid, loaded(1), loaded(40)).tolist() == [True, False, True]
