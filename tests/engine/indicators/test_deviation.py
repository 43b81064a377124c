"""Standard deviations, against ages at death drawn one by one and against sums written out."""

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.chain import Chain, run
from engine.estimates import Reason
from engine.indicators import INDICATORS, estimate
from engine.settings import SETTINGS
from engine.tables import LifeTable
from tests.factories import GRIDS, gompertz_panel

SETTINGS_1 = SETTINGS["almanac-1"]
AT_BIRTH, FROM_10, VARIATION = (INDICATORS[key] for key in ("sd0", "sd10", "cv"))


def chain_of(grid: str, **law: float) -> Chain:
    return run(gompertz_panel(GRIDS[grid], seed=1, **law), SETTINGS_1)


def written_out(table: LifeTable, first: int) -> float:
    """Standard deviation over groups from position `first`, each with the variance inside it."""
    ages = np.array(table.grid.starts) + table.ax
    inside = np.append(np.zeros(len(ages) - 1), table.ax[-1] ** 2)
    weight = table.dx[first:] / table.dx[first:].sum()
    mean = (weight * ages[first:]).sum()
    return float(np.sqrt((weight * ((ages[first:] - mean) ** 2 + inside[first:])).sum()))


@pytest.mark.parametrize("grid", GRIDS)
@pytest.mark.parametrize("infant", [0.004, 0.15])
def test_the_deviation_is_that_of_the_ages_at_death(grid: str, infant: float) -> None:
    chain = chain_of(grid, infant=infant)
    table = chain.table
    at_10 = table.grid.position(10)
    assert AT_BIRTH.value(chain) == pytest.approx(written_out(table, 0), rel=1e-12)
    assert FROM_10.value(chain) == pytest.approx(written_out(table, at_10), rel=1e-12)
    assert VARIATION.value(chain) == pytest.approx(written_out(table, 0) / table.ex[0], rel=1e-12)


def test_deaths_before_10_do_not_count_from_10() -> None:
    grid = GRIDS["single"]
    few, many = (run(gompertz_panel(grid, infant=m), SETTINGS_1) for m in (0.004, 0.15))
    assert AT_BIRTH.value(many) > AT_BIRTH.value(few) + 5
    assert FROM_10.value(many) == pytest.approx(FROM_10.value(few), rel=1e-12)


def test_the_spread_needs_a_small_open_group_and_the_age() -> None:
    panel = gompertz_panel(GRIDS["abridged"])
    short = panel.regroup(AgeGrid((0, 1, *range(5, 86, 5))))
    coarse = panel.regroup(AgeGrid((0, 1, 5, *range(20, 101, 5))))
    for one in (AT_BIRTH, FROM_10, VARIATION):
        assert estimate(one, short, SETTINGS_1).reason == Reason.OPEN_GROUP_TOO_LARGE
    assert estimate(FROM_10, coarse, SETTINGS_1).reason == Reason.AGE_NOT_ON_GRID
    assert np.isfinite(estimate(AT_BIRTH, coarse, SETTINGS_1).high)
