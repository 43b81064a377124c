"""Gini, Theil and mean log deviation, against ages at death written out one by one."""

import numpy as np
import pytest

from engine.chain import Chain, run
from engine.indicators import INDICATORS
from engine.settings import SETTINGS
from engine.tables import LifeTable
from tests.factories import GRIDS, gompertz_panel

SETTINGS_1 = SETTINGS["almanac-1"]
GINI, DIFFERENCE, THEIL, LOG_DEVIATION = (
    INDICATORS[key] for key in ("gini", "aid", "theil", "mld")
)


def chain_of(grid: str, **law: float) -> Chain:
    return run(gompertz_panel(GRIDS[grid], seed=1, **law), SETTINGS_1)


def lives(table: LifeTable) -> tuple[np.ndarray, np.ndarray]:
    """Ages at death and how many die at them: the open group in 20,000 lives of equal weight, at
    the mean of each slice of the exponential law."""
    cuts = np.linspace(0, 1, 20_001)[:-1]
    ends = np.append(-np.log1p(-cuts), np.inf)
    tail = np.append((1 + ends[:-1]) * np.exp(-ends[:-1]), 0)
    beyond = table.grid.starts[-1] + table.ax[-1] * -np.diff(tail) * 20_000
    ages = np.append(np.array(table.grid.starts[:-1]) + table.ax[:-1], beyond)
    return ages, np.append(table.dx[:-1], np.full(20_000, table.dx[-1] / 20_000))


@pytest.mark.parametrize("grid", GRIDS)
@pytest.mark.parametrize("infant", [0.004, 0.15])
def test_the_measures_are_those_of_the_ages_at_death(grid: str, infant: float) -> None:
    chain = chain_of(grid, infant=infant)
    ages, weight = lives(chain.table)
    mean = (weight * ages).sum()
    pairs = np.cumsum(weight) - weight / 2  # ages rise: each is above so many of the others
    half_difference = (weight * ages * (2 * pairs - 1)).sum()
    assert mean == pytest.approx(chain.table.ex[0], rel=1e-12)
    assert DIFFERENCE.value(chain) == pytest.approx(half_difference, rel=1e-7)
    assert GINI.value(chain) == pytest.approx(half_difference / mean, rel=1e-7)
    share = ages / mean
    theil = (weight * share * np.log(share)).sum()
    assert THEIL.value(chain) == pytest.approx(theil, rel=1e-6)
    assert LOG_DEVIATION.value(chain) == pytest.approx(-(weight * np.log(share)).sum(), rel=1e-6)


def test_half_the_difference_of_two_picked_at_random() -> None:
    chain = chain_of("single")
    ages, weight = lives(chain.table)
    rng = np.random.default_rng(5)
    one, two = rng.choice(ages, (2, 1_000_000), p=weight / weight.sum())
    half = np.abs(one - two) / 2
    error = half.std() / 1000
    assert DIFFERENCE.value(chain) == pytest.approx(half.mean(), abs=4 * error)


@pytest.mark.parametrize("key", SETTINGS)
def test_the_difference_is_the_gini_coefficient_in_years(key: str) -> None:
    chain = run(gompertz_panel(seed=3, infant=[0.004, 0.1]), SETTINGS[key])
    gini = GINI.value(chain)
    np.testing.assert_allclose(DIFFERENCE.value(chain), gini * chain.table.ex[..., 0], rtol=1e-12)
    assert np.all((gini > 0) & (gini < 0.5))


def test_where_all_die_nobody_is_left_to_count() -> None:
    """A group in which all who enter die ends the table: later ones have no weight."""
    panel = gompertz_panel(GRIDS["abridged"])
    panel.deaths[18] = 0.5 * panel.exposure[18]
    chain = run(panel, SETTINGS_1)
    assert chain.table.lx[19] == 0
    for one in (GINI, DIFFERENCE, THEIL, LOG_DEVIATION, INDICATORS["sd0"]):
        assert np.isfinite(one.value(chain))
