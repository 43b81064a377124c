"""Years lost, unevenness and threshold ages, by sums written out and by the laws they obey."""

from dataclasses import replace

import numpy as np
import pytest

from engine.chain import gradient, run
from engine.indicators import INDICATORS
from engine.indicators.losses import lost_by_group, threshold
from engine.settings import SETTINGS
from tests.factories import GRIDS, gompertz_panel

SETTINGS_1 = SETTINGS["almanac-1"]
E0, EDAGGER, H = (INDICATORS[key] for key in ("e0", "edagger", "H"))
EARLY, LATE = (INDICATORS[key] for key in ("edagger_early", "edagger_late"))
THRESHOLDS = {
    "edagger": INDICATORS["threshold_edagger"],
    "H": INDICATORS["threshold_H"],
}


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


def test_years_lost_fall_when_deaths_move_together() -> None:
    g = gradient(EDAGGER, run(gompertz_panel(GRIDS["single"]), SETTINGS_1))
    assert g[1] > 0  # deaths of children spread lengths of life
    assert g[95] < 0  # deaths of the oldest draw them together


@pytest.mark.parametrize("grid", GRIDS)
@pytest.mark.parametrize("key", THRESHOLDS)
def test_a_life_saved_draws_together_below_the_threshold_and_apart_above(
    key: str, grid: str
) -> None:
    chain = run(gompertz_panel(GRIDS[grid], infant=[0.004, 0.05]), SETTINGS_1)
    starts, ages = np.array(chain.table.grid.starts), THRESHOLDS[key].value(chain)
    for moved, age in zip(gradient(INDICATORS[key], chain), ages, strict=True):
        g = moved / chain.table.grid.widths  # per year of age
        group = np.searchsorted(starts, age, side="right") - 1
        assert np.all(g[1 : group - 1] > 0)
        assert np.all(g[group + 2 : -1] < 0)
        middles = (starts[group - 1 : group + 2] + starts[group : group + 3]) / 2
        turn = np.interp(0, -g[group - 1 : group + 2], middles)
        assert turn == pytest.approx(age, abs=0.05 if grid == "single" else 1)


@pytest.mark.parametrize("grid", GRIDS)
def test_the_threshold_ages_satisfy_what_defines_them(grid: str) -> None:
    """Where the age is a start of a group the equation holds in the table itself."""
    chain = run(gompertz_panel(GRIDS[grid], seed=1, infant=0.01), SETTINGS_1)
    table = chain.table
    for x in (GRIDS[grid].position(age) for age in (60, 70, 80)):
        lost = (table.dx * lost_by_group(table))[x:].sum() / table.lx[x]
        level = lost / table.ex[x] - np.log(table.lx[x])
        found = threshold(table, level)
        assert found.age == pytest.approx(table.grid.starts[x], abs=1e-9)
    own = {key: float(one.value(chain)) for key, one in THRESHOLDS.items()}
    for key, level in (("edagger", 1.0), ("H", 1 + H.value(chain))):
        assert threshold(table, np.asarray(level)).age == own[key]
    assert own["edagger"] < own["H"]


def test_the_threshold_moves_without_a_step_from_group_to_group() -> None:
    table = run(gompertz_panel(seed=1), SETTINGS_1).table
    levels = np.linspace(0.5, 2, 3_001)
    columns = {
        name: getattr(table, name) for name in ("mx", "ax", "qx", "lx", "dx", "Lx", "Tx", "ex")
    }
    many = replace(
        table, **{name: np.broadcast_to(one, (3_001, len(one))) for name, one in columns.items()}
    )
    ages = threshold(many, levels).age
    assert np.all(np.diff(ages) > 0)
    assert np.diff(ages, n=2).max() < 0.0005  # neither it nor its slope jumps


@pytest.mark.parametrize("key", SETTINGS)
def test_early_and_late_deaths_make_up_the_whole(key: str) -> None:
    chain = run(gompertz_panel(seed=1, infant=[0.003, 0.05, 0.2]), SETTINGS[key])
    early, late = EARLY.value(chain), LATE.value(chain)
    np.testing.assert_allclose(early + late, EDAGGER.value(chain), rtol=1e-14)
    assert np.all((early > 0) & (late > 0))


def test_early_deaths_are_those_below_the_threshold() -> None:
    chain = run(gompertz_panel(GRIDS["single"], seed=1), SETTINGS_1)
    table, age = chain.table, float(THRESHOLDS["edagger"].value(chain))
    lost = np.append(0, np.cumsum(table.dx * lost_by_group(table)))[: len(table.grid)]
    assert EARLY.value(chain) == pytest.approx(np.interp(age, table.grid.starts, lost), rel=1e-12)


def test_children_who_die_are_early_deaths() -> None:
    few, many = (run(gompertz_panel(infant=m), SETTINGS_1) for m in (0.004, 0.05))
    assert EARLY.value(many) > EARLY.value(few) + 2
    assert LATE.value(many) == pytest.approx(LATE.value(few), rel=0.2)
