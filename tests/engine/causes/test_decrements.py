"""Multiple decrement tables and years lost: constant hazards in closed form, and definitions."""

import numpy as np
import pytest
from numpy.testing import assert_allclose

from engine.ages import AgeGrid, Array
from engine.causes.counts import CauseCounts
from engine.causes.decrements import FAMILY, chance_before
from engine.causes.losses import EDAGGER, UNEVENNESS, years_lost
from engine.causes.number import estimates
from engine.causes.parting import part
from engine.chain import run
from engine.estimates import Reason
from engine.panel import Panel
from engine.settings import SETTINGS, Settings
from tests.factories import GRIDS, gompertz_panel, parted

pytestmark = pytest.mark.fast
STEADY, PLAIN = SETTINGS["almanac-1-constant-rate"], SETTINGS["almanac-1"]
M1, M2 = 0.01, 0.03


def hazards() -> tuple[Panel, CauseCounts]:
    grid = AgeGrid((*range(0, 301, 5),))
    years = np.full(len(grid), 1e6)
    causes = CauseCounts(np.stack([M1 * years, M2 * years]))
    return Panel.of(grid, (M1 + M2) * years, years, sex="f"), causes


def test_two_constant_hazards() -> None:
    """A quarter dies of the first, at 1 / m on average as of the second; before 75 the same part of
    1 - exp(-75 m); the years lost per death are 1 / m, by cause as the rates are."""
    panel, causes = hazards()
    m = M1 + M2
    found = estimates([*FAMILY, EDAGGER, UNEVENNESS], panel, causes, STEADY)
    part = np.array([M1, M2]) / m
    assert_allclose(found["chance"].value, part, rtol=1e-12)
    assert_allclose(found["chance75"].value, part * -np.expm1(-75 * m), rtol=1e-10)
    assert_allclose(found["mean_age"].value, [1 / m, 1 / m], rtol=1e-10)
    assert_allclose(found["edagger"].value, part / m, rtol=1e-10)
    assert_allclose(found["H"].value, part, rtol=1e-10)


def deaths_in_table(panel: Panel, causes: CauseCounts, settings: Settings) -> Array:
    """d(x) m_i(x) / m(x), on the panel's grid."""
    parted = part(panel, causes, settings)
    table = parted.chain.table
    return table.grid.regroup(np.moveaxis(parted.share * table.dx, 0, -2), panel.grid)


def test_deaths_of_the_table_are_parted_as_those_counted() -> None:
    panel = gompertz_panel(GRIDS["abridged"], seed=5, slope=np.array([0.09, 0.1]))
    causes = parted(panel)
    for settings in SETTINGS.values():
        found, table = deaths_in_table(panel, causes, settings), run(panel, settings).table
        whole = table.grid.regroup(table.dx, panel.grid)
        assert_allclose(found.sum(axis=-2), whole, rtol=1e-12)
        assert_allclose(found, causes.shares(panel) * whole[..., None, :], rtol=1e-12)


def test_chance_before_an_age_and_mean_age_read_the_table() -> None:
    panel = gompertz_panel(seed=5)
    causes = parted(panel)
    dx, table = deaths_in_table(panel, causes, PLAIN), run(panel, PLAIN).table
    found = estimates([*FAMILY, chance_before(40)], panel, causes, PLAIN)
    young = np.array(panel.grid.starts) < 40
    assert_allclose(found["chance40"].value, (dx * young).sum(axis=-1), rtol=1e-12)
    age = np.array(panel.grid.starts) + table.ax
    assert_allclose(found["mean_age"].value, (dx * age).sum(axis=-1) / dx.sum(axis=-1), rtol=1e-12)
    # weighted by the chance of each cause, mean ages make up the mean age of all, e(0)
    mean = (found["mean_age"].value * found["chance"].value).sum()
    assert mean == pytest.approx(table.ex[0], rel=1e-12)


def test_one_percent_fewer_deaths_of_a_cause_gain_a_hundredth_of_its_years_lost() -> None:
    """On single ages with steady rates e-dagger of a cause is -d e(0) / d log of its rates."""
    panel = gompertz_panel(GRIDS["single"], seed=5, people=5e6)
    causes = parted(panel)
    lost = estimates([EDAGGER], panel, causes, STEADY)["edagger"].value
    e0 = run(panel, STEADY).table.ex[0]
    for cause in range(3):
        rates = (panel.deaths - 1e-5 * causes.deaths[cause]) / panel.exposure
        gained = (run(panel, STEADY, mx=rates).table.ex[0] - e0) / 1e-5
        assert gained == pytest.approx(lost[cause], rel=2e-3)


def test_years_lost_by_age_take_the_mean_expectation_of_the_group() -> None:
    panel = gompertz_panel(seed=5)
    causes = parted(panel)
    cells, table = years_lost(panel, causes, PLAIN), run(panel, PLAIN).table
    x, n = 10, 5.0
    lost = table.ex[x + 1] + (1 - table.ax[x] / n) * (table.ex[x] - table.ex[x + 1])
    assert_allclose(cells[:, x], causes.shares(panel)[:, x] * table.dx[x] * lost, rtol=1e-12)


def test_a_cause_nobody_dies_of_has_a_chance_of_nought_with_a_limit_and_no_mean_age() -> None:
    panel = gompertz_panel(seed=5)
    causes = CauseCounts(np.stack([panel.deaths, 0 * panel.deaths]))
    found = estimates(FAMILY, panel, causes, PLAIN)
    assert found["chance"].value[1] == 0
    assert found["chance"].low[1] == 0 < found["chance"].high[1] < 1e-2
    assert found["mean_age"].reason[1] == Reason.TOO_FEW_DEATHS


def test_an_age_that_begins_no_group_gives_none() -> None:
    panel = gompertz_panel(seed=5)
    found = estimates([chance_before(42)], panel, parted(panel), PLAIN)["chance42"]
    assert (found.reason == Reason.AGE_NOT_ON_GRID).all()
