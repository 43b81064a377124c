"""Years lost, unevenness and median, by sums written out and by the laws they obey."""

from dataclasses import replace

import numpy as np
import pytest

from engine.chain import gradient, run
from engine.indicators import INDICATORS
from engine.settings import SETTINGS
from tests.factories import GRIDS, gompertz_panel

SETTINGS_1 = SETTINGS["almanac-1"]
E0, EDAGGER, H, MEDIAN = (INDICATORS[key] for key in ("e0", "edagger", "H", "median"))


@pytest.mark.parametrize("name", GRIDS)
def test_years_lost_are_the_sum_over_groups_written_out(name: str) -> None:
    table = run(gompertz_panel(GRIDS[name], seed=2), SETTINGS_1).table
    total = 0.0
    for x, n in enumerate(table.grid.widths[:-1]):
        here, after = table.ex[x], table.ex[x + 1]
        total += table.dx[x] * (after + (1 - table.ax[x] / n) * (here - after))
    total += table.dx[-1] * table.ex[-1]
    chain = run(gompertz_panel(GRIDS[name], seed=2), SETTINGS_1)
    assert EDAGGER.value(chain) == pytest.approx(total, rel=1e-13)
    assert H.value(chain) == pytest.approx(total / table.ex[0], rel=1e-13)


@pytest.mark.parametrize("infant", [0.003, 0.05])
def test_one_per_cent_lower_rates_add_h_per_cent(infant: float) -> None:
    panel = gompertz_panel(infant=infant)
    lower = replace(panel, deaths=panel.deaths * (1 - 1e-6))
    e0, more = (E0.value(run(p, SETTINGS_1)) for p in (panel, lower))
    # not exactly H: the first-year rule moves with the infant rate
    assert (more / e0 - 1) / 1e-6 == pytest.approx(H.value(run(panel, SETTINGS_1)), rel=0.01)


def test_half_of_those_born_see_the_median() -> None:
    chain = run(gompertz_panel(GRIDS["single"], seed=1), SETTINGS_1)
    age, table = float(MEDIAN.value(chain)), chain.table
    assert np.interp(age, table.grid.starts, table.lx) == pytest.approx(0.5, abs=1e-12)


def test_years_lost_fall_when_deaths_move_together() -> None:
    g = gradient(EDAGGER, run(gompertz_panel(GRIDS["single"]), SETTINGS_1))
    assert g[1] > 0  # deaths of children spread lengths of life
    assert g[95] < 0  # deaths of the oldest draw them together
