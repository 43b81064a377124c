"""Rates of adults smoothed over age: what is kept, what is left alone, the pullback, gaps."""

import numpy as np
import pytest

from engine.ages import AgeGrid
from engine.settings import SETTINGS
from engine.stages.rates import Rates, death_rates, given_rates
from engine.stages.smoothing import SMOOTHINGS, Smoothed, adult_groups, smooth
from tests.factories import GRIDS, gompertz_panel, gompertz_rates

PLAIN = SETTINGS["almanac-1"]
every_grid = pytest.mark.parametrize("grid", GRIDS.values(), ids=GRIDS)


def smoothed(grid: AgeGrid, rates: Rates) -> Smoothed:
    return smooth(grid, rates, PLAIN)


def drawn(grid: AgeGrid, people: float = 60_000, seed: int = 2) -> Rates:
    panel = gompertz_panel(grid, people=people, seed=seed, slope=np.array([0.08, 0.1, 0.11]))
    return death_rates(panel.deaths, panel.exposure)


@every_grid
def test_children_and_the_open_group_are_kept_and_the_total_of_deaths(grid: AgeGrid) -> None:
    rates = drawn(grid)
    got, groups = smoothed(grid, rates).mx, adult_groups(grid)
    assert grid.starts[groups.start] >= 10 > grid.starts[groups.start - 1]
    kept = [*range(groups.start), len(grid) - 1]
    np.testing.assert_array_equal(got[:, kept], rates.mx[:, kept])
    assert (got[:, groups] != rates.mx[:, groups]).all()
    deaths = (got * rates.exposure)[:, groups].sum(axis=-1)
    np.testing.assert_allclose(deaths, rates.deaths[:, groups].sum(axis=-1), rtol=1e-9)


@every_grid
def test_a_law_with_straight_logarithms_is_left_as_it_is(grid: AgeGrid) -> None:
    panel = gompertz_panel(grid, accidents=0.0, people=40_000)
    rates = death_rates(panel.deaths, panel.exposure)
    groups = adult_groups(grid)
    np.testing.assert_allclose(smoothed(grid, rates).mx[groups], rates.mx[groups], rtol=1e-6)


@every_grid
def test_smoothed_rates_are_nearer_to_the_law_than_those_counted(grid: AgeGrid) -> None:
    rates, groups = drawn(grid), adult_groups(grid)
    law = gompertz_rates(grid, slope=np.array([0.08, 0.1, 0.11]))
    off, raw = (
        (rates.exposure * (mx - law) ** 2 / law)[:, groups].sum(axis=-1)
        for mx in (smoothed(grid, rates).mx, rates.mx)
    )
    assert (off < 0.6 * raw).all()


@every_grid
def test_the_pullback_is_the_complex_step(grid: AgeGrid) -> None:
    panel = gompertz_panel(grid, people=60_000, seed=2)
    rates = death_rates(panel.deaths, panel.exposure)
    g, toward = np.random.default_rng(1).standard_normal((2, len(grid)))
    pulled = smoothed(grid, given_rates(rates.mx, rates.exposure)).pull(g)
    toward *= rates.mx + 1e-4
    beside = smoothed(grid, given_rates(rates.mx + 1e-30j * toward, rates.exposure)).mx
    # a heavy penalty on few deaths leaves some ten digits
    assert (beside.imag / 1e-30 * g).sum() == pytest.approx((pulled * toward).sum(), rel=1e-9)


@every_grid
def test_one_age_moves_others_as_the_pullback_says(grid: AgeGrid) -> None:
    panel = gompertz_panel(grid, people=400_000, seed=2)
    rates = death_rates(panel.deaths, panel.exposure)
    groups = adult_groups(grid)
    for read, moved in ((groups.start, groups.start + 1), (groups.stop - 1, groups.stop - 3)):
        g = np.zeros(len(grid))
        g[read] = 1
        mx = rates.mx.astype(complex)
        mx[moved] += 1e-30j
        step = smoothed(grid, given_rates(mx, rates.exposure)).mx[read].imag / 1e-30
        pulled = smoothed(grid, given_rates(rates.mx, rates.exposure)).pull(g)
        assert step == pytest.approx(pulled[moved], rel=1e-7)
        assert step != 0


def test_a_group_without_person_years_takes_the_curve_and_owns_no_part_of_it() -> None:
    grid = GRIDS["abridged"]
    rates = drawn(grid)
    deaths, exposure = rates.deaths.copy(), rates.exposure.copy()
    deaths[:, 8], exposure[:, 8] = 0, 0
    holed = death_rates(deaths, exposure)
    got = smoothed(grid, holed)
    np.testing.assert_array_less(got.mx[:, 7], got.mx[:, 8])
    np.testing.assert_array_less(got.mx[:, 8], got.mx[:, 9])
    g = np.zeros(got.mx.shape)
    g[:, 8] = 1
    assert (got.pull(g)[:, 8] == 0).all()
    assert (got.pull(g)[:, 7] != 0).all()


def test_deaths_of_a_group_without_person_years_count_in_the_one_below() -> None:
    grid = GRIDS["abridged"]
    counted, groups = drawn(grid), adult_groups(grid)
    exposure = counted.exposure.copy()
    exposure[:, 8] = 0
    rates = death_rates(counted.deaths, exposure)
    assert (rates.deaths[:, 8] > 0).all()
    moved = rates.deaths.copy()
    moved[:, 7] += moved[:, 8]
    moved[:, 8] = 0
    expected = smoothed(grid, death_rates(moved, exposure)).mx[:, groups]
    np.testing.assert_allclose(smoothed(grid, rates).mx[:, groups], expected, rtol=1e-12)


def test_gaps() -> None:
    grid = GRIDS["abridged"]
    rates = drawn(grid)
    deaths = rates.deaths.copy()
    deaths[0, 12] = np.nan
    deaths[1, 3:-1] = 0
    got = smoothed(grid, death_rates(deaths, rates.exposure))
    groups = adult_groups(grid)
    assert np.isnan(got.mx[:2, groups]).all()
    np.testing.assert_array_equal(got.mx[2], smoothed(grid, rates).mx[2])
    few = AgeGrid((0, 1, 5, 10, 40, 60, 80))
    panel = gompertz_panel(few)
    short = smoothed(few, death_rates(panel.deaths, panel.exposure))
    assert np.isnan(short.mx).tolist() == [False] * 3 + [True] * 3 + [False]
    assert np.isnan(short.pull(np.ones(7))[3:6]).all()


def test_left_as_counted() -> None:
    rates = drawn(GRIDS["abridged"])
    got = SMOOTHINGS["none"](GRIDS["abridged"], rates, PLAIN)
    np.testing.assert_array_equal(got.mx, rates.mx)
    np.testing.assert_array_equal(got.pull(rates.mx), rates.mx)
    assert SMOOTHINGS["p_spline"] is smooth
