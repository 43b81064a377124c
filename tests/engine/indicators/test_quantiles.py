"""Quartiles and the shortest half, by interpolation and by looking at every span."""

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.chain import Chain, run
from engine.estimates import Reason
from engine.indicators import INDICATORS, Indicator, estimate
from engine.indicators.quantiles import ages_at
from engine.settings import SETTINGS
from tests.factories import GRIDS, gompertz_panel

SETTINGS_1 = SETTINGS["almanac-1"]
LOWER, MEDIAN, UPPER, RANGE, SHORTEST = (
    INDICATORS[key]
    for key in ("lower_quartile", "median", "upper_quartile", "iqr", "shortest_half")
)


def chain_of(grid: str, **law: float) -> Chain:
    return run(gompertz_panel(GRIDS[grid], seed=1, **law), SETTINGS_1)


@pytest.mark.parametrize("grid", GRIDS)
@pytest.mark.parametrize("infant", [0.003, 0.4])
@pytest.mark.parametrize(("one", "share"), [(LOWER, 0.75), (MEDIAN, 0.5), (UPPER, 0.25)])
def test_so_many_of_those_born_see_the_age(
    one: Indicator, share: float, grid: str, infant: float
) -> None:
    chain = chain_of(grid, infant=infant)
    table = chain.table
    seen = np.interp(one.value(chain), table.grid.starts, table.lx)
    assert seen == pytest.approx(share, abs=1e-12)


def test_quartiles_lie_on_both_sides_of_the_median() -> None:
    chain = chain_of("abridged", infant=[0.003, 0.05, 0.1], slope=[0.1, 0.105, 0.11])
    assert np.all(LOWER.value(chain) < MEDIAN.value(chain))
    assert np.all(MEDIAN.value(chain) < UPPER.value(chain))
    np.testing.assert_array_equal(RANGE.value(chain), UPPER.value(chain) - LOWER.value(chain))


@pytest.mark.parametrize("grid", GRIDS)
@pytest.mark.parametrize("infant", [0.004, 0.15, 0.6])
def test_no_other_span_with_half_of_deaths_is_shorter(grid: str, infant: float) -> None:
    chain = chain_of(grid, infant=infant)
    starts, lx = np.array(chain.table.grid.starts, float), chain.table.lx
    begins = np.linspace(0, MEDIAN.value(chain), 20_001)
    left = np.interp(begins, starts, lx) - 0.5
    ends = np.interp(-left, -lx, starts, right=np.inf)
    spans = np.where(left >= lx[-1], ends - begins, np.inf)
    shortest = SHORTEST.value(chain)
    assert shortest <= spans.min() + 1e-9
    assert shortest == pytest.approx(spans.min(), abs=0.01)


def test_the_shortest_half_is_no_longer_than_the_middle_one() -> None:
    chain = chain_of("single", infant=[0.003, 0.05, 0.1])
    assert np.all(SHORTEST.value(chain) <= RANGE.value(chain))


def test_half_of_deaths_in_one_group_are_the_shortest_half() -> None:
    panel = gompertz_panel(GRIDS["abridged"])
    panel.deaths[15] = 0.5 * panel.exposure[15]  # 70-74: nearly all who reach it
    panel.deaths[16:] = 0.1 * panel.exposure[16:]
    table = run(panel, SETTINGS_1).table
    assert table.dx[15] > 0.5
    assert SHORTEST.value(run(panel, SETTINGS_1)) == pytest.approx(5 * 0.5 / table.dx[15])


def test_where_nobody_dies_the_first_of_the_ages_is_given() -> None:
    panel = gompertz_panel(GRIDS["single"])
    panel.deaths[20:30] = 0
    table = run(panel, SETTINGS_1).table
    assert ages_at(table, table.lx[25:26]) == pytest.approx(20)


def test_an_age_in_the_open_group_is_none() -> None:
    panel = gompertz_panel(GRIDS["abridged"])
    short = panel.regroup(AgeGrid((0, 1, *range(5, 71, 5))))
    assert run(short, SETTINGS_1).open_reach > 0.75
    for one in (LOWER, MEDIAN, UPPER, RANGE, SHORTEST):
        got = estimate(one, short, SETTINGS_1)
        assert np.isnan(got.value)
        assert got.reason == Reason.OPEN_GROUP_TOO_LARGE


def test_the_upper_quartile_is_read_below_a_small_open_group_only() -> None:
    short = gompertz_panel(GRIDS["abridged"]).regroup(AgeGrid((0, 1, *range(5, 91, 5))))
    assert 0.05 < run(short, SETTINGS_1).open_reach < 0.25
    assert np.isfinite(estimate(MEDIAN, short, SETTINGS_1).value)
    assert estimate(UPPER, short, SETTINGS_1).reason == Reason.OPEN_GROUP_TOO_LARGE
