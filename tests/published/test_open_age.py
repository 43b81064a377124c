"""What closing a table too low does to the spread of lengths of life.

Three Gompertz populations whose mode moves from 82 to 90 while lengths of life grow more equal.
True e-dagger by quadrature: 10.62, 10.24, 9.52. Closed at 85+ by the reciprocal of the open group's
rate it reads 11.02, 11.11, 11.24: it rises.
"""

from dataclasses import replace

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.chain import run
from engine.estimates import Reason
from engine.indicators import estimate
from engine.indicators import find as find_indicator
from engine.panel import Panel
from engine.settings import find
from engine.tables import LifeTable
from tests.published import denmark

MODES, SLOPES = np.array([82.0, 86.0, 90.0]), np.array([0.0938, 0.0975, 0.105])
TRUE, CLOSED = (10.62, 10.24, 9.52), (11.02, 11.11, 11.24)
STEP = 0.005
AGES = np.arange(0, 130 + STEP / 2, STEP)


def survivors() -> np.ndarray:
    """l(x) of the three laws, [population, age in steps]; hazard slope * exp(slope (x - mode))."""
    cumulative = np.exp(-SLOPES * MODES)[:, None] * np.expm1(SLOPES[:, None] * AGES)
    return np.asarray(np.exp(-cumulative))


def counts(open_age: int) -> Panel:
    """Stationary populations of these laws in single years up to an open age."""
    grid, lx, per_year = AgeGrid(tuple(range(open_age + 1))), survivors(), round(1 / STEP)
    ends = lx[:, : open_age * per_year + 1 : per_year]
    deaths = np.concatenate([-np.diff(ends, axis=-1), ends[:, -1:]], axis=-1)
    lived = (lx[:, 1:] + lx[:, :-1]) / 2 * STEP
    starts = [age * per_year for age in grid.starts]
    return Panel.of(grid, deaths, np.add.reduceat(lived, starts, axis=-1), sex="f")


def years_lost(table: LifeTable) -> np.ndarray:
    """e-dagger = sum d [e(x+n) + (1 - a/n)(e(x) - e(x+n))] + d(w) e(w)."""
    share, e = table.ax[..., :-1] / table.grid.widths[:-1], table.ex
    inside = table.dx[..., :-1] * (e[..., 1:] + (1 - share) * (e[..., :-1] - e[..., 1:]))
    return np.asarray(inside.sum(axis=-1) + table.dx[..., -1] * e[..., -1])


@pytest.mark.fast
def test_the_truth_by_quadrature() -> None:
    lx = survivors()
    integrand = -lx * np.log(np.maximum(lx, 1e-300))
    true = ((integrand[:, 1:] + integrand[:, :-1]) / 2 * STEP).sum(axis=-1)
    np.testing.assert_allclose(true, TRUE, atol=0.02)


@pytest.mark.fast
def test_closing_at_85_by_the_reciprocal_reverses_the_trend() -> None:
    closed = years_lost(run(counts(85), find("almanac-1")).table)
    np.testing.assert_allclose(closed, CLOSED, atol=0.02)
    assert closed[0] < closed[1] < closed[2]


@pytest.mark.fast
@pytest.mark.parametrize("key", ["edagger", "H", "mode", "mode_raw", "mode_parabola"])
def test_what_would_be_reversed_is_not_shown(key: str) -> None:
    """Three estimates in place of the rising figures: none, and why."""
    panel = counts(85)
    large = replace(panel, deaths=1e4 * panel.deaths, exposure=1e4 * panel.exposure)
    names = np.array(["early", "later", "late"])
    got = estimate(find_indicator(key), large, find("almanac-1"), streams=names)
    assert np.isnan([got.value, got.low, got.high]).all()
    assert (got.reason == Reason.OPEN_GROUP_TOO_LARGE).all()


@pytest.mark.fast
@pytest.mark.parametrize(("open_age", "settings"), [(110, "almanac-1"), (85, "almanac-1-gompertz")])
def test_a_high_open_age_or_a_law_keeps_it(open_age: int, settings: str) -> None:
    table = run(counts(open_age), find(settings)).table
    np.testing.assert_allclose(years_lost(table), TRUE, atol=0.02)


@pytest.mark.fast
def test_another_law_than_the_true_one_errs_but_keeps_the_trend() -> None:
    """Kannisto's law has fewer deaths at the highest ages than the true one, and so more spread."""
    found = years_lost(run(counts(85), find("almanac-1-kannisto")).table)
    assert (np.diff(found) < -0.3).all()
    assert (found - TRUE > 0.1).all()
    assert (found - TRUE < 0.35).all()


@pytest.mark.fast
@pytest.mark.parametrize(
    ("open_age", "least", "most"), [(95, 0, 0.01), (85, 0.15, 0.2), (80, 0.5, 0.6), (75, 1, 1.3)]
)
def test_closing_low_lengthens_life_by_what_the_settings_say(
    open_age: int, least: float, most: float
) -> None:
    """Danish women and men through 39 years, against the same counts to 99+: what an open group
    holds is no stationary population."""
    grid, plain = AgeGrid(tuple(range(open_age + 1))), find("almanac-1")
    longer = [
        run(panel.regroup(grid), plain).table.ex[:, 0] - run(panel, plain).table.ex[:, 0]
        for panel in map(denmark.panel, denmark.SEXES)
    ]
    assert least <= np.max(longer) <= most
    assert np.min(longer) > -0.001


@pytest.mark.fast
def test_life_expectancy_at_moderate_ages_hardly_minds() -> None:
    low, high = (run(counts(age), find("almanac-1")).table.ex for age in (85, 110))
    np.testing.assert_allclose(low[:, [0, 65]], high[:, [0, 65]], atol=1e-3)
