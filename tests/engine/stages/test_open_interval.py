"""An open group without deaths: its rate borrowed from the whole, or no expectation of life."""

from dataclasses import replace

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.chain import gradient, run
from engine.estimates import Reason
from engine.indicators import estimate
from engine.indicators import find as indicator
from engine.panel import Panel
from engine.settings import find
from tests.engine.stepping import complex_step, largest_error
from tests.factories import codes, gompertz_panel

pytestmark = pytest.mark.fast
E0, BORROW, PLAIN = indicator("e0"), find("almanac-1-borrow"), find("almanac-1")
LAST = 1234.0, 4000.0  # deaths and person-years of the whole at 100 and over


def counted(panel: Panel, deaths: float, exposure: float) -> Panel:
    """The same with these counts in the open group."""
    panel = panel.over(np.copy)
    panel.deaths[..., -1], panel.exposure[..., -1] = deaths, exposure
    return panel


def villages() -> Panel:
    """Three of them: nobody died at 100 and over in the first and the last; the last is part of no
    larger area."""
    panel = gompertz_panel(seed=2, people=400_000, level=np.array([2e-5, 2.2e-5, 1.9e-5]))
    panel.deaths[:, -1] = 0.0, 3.0, 0.0
    whole = counted(gompertz_panel(seed=9, people=9e6, level=np.full(3, 2e-5)), *LAST)
    whole.deaths[2], whole.exposure[2] = np.nan, np.nan
    return replace(panel, whole=whole)


def test_nobody_died_in_it_so_it_takes_the_rate_of_the_whole_and_is_marked() -> None:
    chain = run(villages(), BORROW)
    np.testing.assert_array_equal(chain.borrowed, [True, False, False])
    assert chain.mx[0, -1] == LAST[0] / LAST[1]
    np.testing.assert_array_equal(chain.mx[:, :-1], chain.rates.mx[:, :-1])
    own = counted(villages()[0], *LAST)
    np.testing.assert_array_equal(chain.table.ex[0], run(own, PLAIN).table.ex)
    np.testing.assert_array_equal(chain.table.ex[1], run(villages(), PLAIN).table.ex[1])


def test_without_a_whole_that_has_deaths_it_stays_undefined() -> None:
    alone = replace(villages(), whole=None)
    empty = replace(villages(), whole=counted(villages(), 0, 100.0))
    for panel, settings in ((villages(), PLAIN), (alone, BORROW), (empty, BORROW)):
        chain = run(panel, settings)
        assert not chain.borrowed.any()
        assert np.isnan(chain.table.ex[[0, 2]]).all()
        found = estimate(E0, panel, settings)
        np.testing.assert_array_equal(found.reason == Reason.NO_DEATHS_IN_OPEN_GROUP, [1, 0, 1])


def test_a_borrowed_rate_gives_a_figure_with_an_interval() -> None:
    panel = villages()
    found = estimate(E0, panel, BORROW)
    np.testing.assert_array_equal(
        found.reason, [Reason.NONE, Reason.NONE, Reason.NO_DEATHS_IN_OPEN_GROUP]
    )
    assert np.all(found.low[:2] < found.value[:2])
    stepped = estimate(indicator("edagger"), panel, BORROW, streams=codes(panel))
    np.testing.assert_array_equal(stepped.reason, found.reason)


def test_a_borrowed_rate_does_not_move_with_the_own_one() -> None:
    panel = villages()[:2]
    chain = run(panel, BORROW)
    found = gradient(E0, chain)
    assert found[0, -1] == 0
    assert found[1, -1] < 0
    expected = complex_step(lambda mx: E0.value(run(panel, BORROW, mx=mx)), chain.rates.mx)
    assert largest_error(found, expected) < 1e-12


def test_the_rates_of_the_table_give_the_table_again() -> None:
    """So a path may begin at a borrowed rate, from where it moves like any other."""
    chain = run(villages()[:2], BORROW)
    again = run(chain.panel, BORROW, mx=chain.mx)
    np.testing.assert_array_equal(again.table.ex, chain.table.ex)
    assert not again.borrowed.any()
    assert np.all(gradient(E0, again)[:, -1] < 0)


def test_an_open_group_of_nobody_joined_with_one_in_which_nobody_died() -> None:
    panel = villages()[0]
    panel.exposure[-1] = 0
    panel.deaths[-2] = 0
    chain = run(panel, BORROW)
    assert chain.borrowed
    np.testing.assert_array_equal(gradient(E0, chain)[-1], 0)
    assert E0.value(chain) > 60


def test_a_law_borrows_nothing() -> None:
    chain = run(villages()[0], replace(find("almanac-1-gompertz"), borrow=True))
    assert not chain.borrowed
    np.testing.assert_array_equal(chain.mx, chain.rates.mx)


@pytest.mark.parametrize(
    ("open_age", "too_low", "low"), [(70, True, True), (75, False, True), (85, False, False)]
)
def test_an_open_group_that_begins_too_low(open_age: int, too_low: bool, low: bool) -> None:
    panel = gompertz_panel(AgeGrid((0, 1, *range(5, open_age + 1, 5))), seed=3, people=3e6)
    chain = run(panel, find("almanac-2"))
    assert (chain.open_too_low, chain.open_low) == (too_low, low)
    found = estimate(E0, panel, find("almanac-2"))
    assert found.reason == (Reason.OPEN_AGE_TOO_LOW if too_low else Reason.NONE)
    assert estimate(E0, panel, PLAIN).reason == Reason.NONE
    assert estimate(indicator("5q0"), panel, find("almanac-2")).reason == Reason.NONE
    spread = run(panel, replace(find("almanac-2"), open_interval="gompertz"))
    assert not spread.open_too_low
    assert not spread.open_low
