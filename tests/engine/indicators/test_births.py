"""Rates over births: counts by hand, what is missing, and what adds up."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from engine.ages import AgeGrid
from engine.chain import Chain, Tally, gradient, run
from engine.indicator import Indicator
from engine.indicators.births import FAMILY
from engine.panel import Panel
from engine.settings import SETTINGS
from tests.factories import GRIDS, gompertz_panel

ENTRIES = {indicator.key: indicator for indicator in FAMILY}
every_rate = pytest.mark.parametrize("indicator", FAMILY, ids=lambda i: i.key)


def with_births(*rows: tuple[float, float, float], infants: float = 30) -> Panel:
    """Live births, stillbirths and neonatal deaths of some populations."""
    panel = gompertz_panel(GRIDS["abridged"], seed=1, slope=np.full(len(rows), 0.1))
    deaths = panel.deaths.copy()
    deaths[:, 0] = infants
    return replace(panel, deaths=deaths, births=np.array(rows))


def chain(panel: Panel) -> Chain:
    return run(panel, SETTINGS["almanac-1"])


@pytest.mark.parametrize(
    ("key", "per_1000"), [("imr", 6.0), ("nmr", 4.0), ("pnmr", 2.0), ("sbr", 1000 / 201)]
)
def test_rates_by_hand(key: str, per_1000: float) -> None:
    """5,000 born alive and 25 still; 30 die in their first year, 20 of them within 28 days."""
    indicator = ENTRIES[key]
    value = indicator.value(chain(with_births((5000.0, 25.0, 20.0))))
    assert indicator.unit.scale * value[0] == pytest.approx(per_1000, rel=1e-12)


def test_the_parts_of_the_first_year_add_up() -> None:
    one = chain(with_births((5000.0, 25.0, 20.0), (812.0, 3.0, 1.0)))
    parts = ENTRIES["nmr"].value(one) + ENTRIES["pnmr"].value(one)
    assert_allclose(parts, ENTRIES["imr"].value(one), rtol=1e-12)


@every_rate
def test_a_rate_is_its_tally_and_has_no_derivative_by_death_rates(indicator: Indicator) -> None:
    one = chain(with_births((5000.0, 25.0, 20.0)))
    tally = indicator.partials(one)
    assert isinstance(tally, Tally)
    assert tally.count[0] in (30, 20, 10, 25)
    assert_allclose(tally.count * tally.weight, indicator.value(one), rtol=1e-15)
    assert indicator.unit.limits == "count"
    with pytest.raises(ValueError, match="is a count over births"):
        gradient(indicator, one)


@every_rate
@pytest.mark.parametrize("missing", [0, 1, 2])
def test_only_what_a_rate_reads_must_be_handed_in(indicator: Indicator, missing: int) -> None:
    live, still, neonatal = np.where(np.arange(3) == missing, np.nan, [5000.0, 25.0, 20.0])
    name = ("live", "stillborn", "neonatal_deaths")[missing]
    value = indicator.value(chain(with_births((live, still, neonatal), (5000.0, 25.0, 20.0))))
    assert np.isnan(value).tolist() == [name in indicator.needs.births, False]


@every_rate
def test_no_births_give_no_rate(indicator: Indicator) -> None:
    assert np.isnan(indicator.value(chain(with_births((0.0, 0.0, 0.0)))))


def test_no_stillbirths_are_a_rate_of_0() -> None:
    assert ENTRIES["sbr"].value(chain(with_births((5000.0, 0.0, 20.0)))) == 0


def test_more_deaths_within_28_days_than_within_the_year_cannot_be() -> None:
    one = chain(with_births((5000.0, 25.0, 31.0), (5000.0, 25.0, 30.0)))
    assert np.isnan(ENTRIES["pnmr"].value(one)).tolist() == [True, False]


@pytest.mark.parametrize(("key", "known"), [("imr", False), ("nmr", True), ("pnmr", False)])
def test_infants_must_be_a_group_of_their_own(key: str, known: bool) -> None:
    grid = AgeGrid((0, *range(5, 101, 5)))
    one = chain(with_births((5000.0, 25.0, 20.0)).regroup(grid))
    assert np.isfinite(ENTRIES[key].value(one)).all() == known


def test_years_pooled_are_counts_over_counts() -> None:
    panel = with_births((5000.0, 25.0, 20.0), (812.0, 3.0, 1.0))
    both = chain(Panel.pooled([panel[:1], panel[1:]]))
    for key, count in (("imr", 60), ("nmr", 21), ("pnmr", 39)):
        assert ENTRIES[key].value(both)[0] == pytest.approx(count / 5812, rel=1e-12)
    assert ENTRIES["sbr"].value(both)[0] == pytest.approx(28 / 5840, rel=1e-12)
