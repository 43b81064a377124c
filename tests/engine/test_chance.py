"""Limits from gamma laws against exact and independent ones, and laws of what moves a number."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose, assert_array_equal
from scipy.stats import chi2, gamma, norm

from engine.ages import AgeGrid, Array
from engine.chain import gradient, run
from engine.chance import KINDS, Chance, astray, chances, limits, miscount, told
from engine.indicators import INDICATORS
from engine.panel import Panel
from engine.settings import SETTINGS
from tests.factories import complete, gompertz_panel

PLAIN = SETTINGS["almanac-1"]


def moved(weights: object, counts: object, astray: float = 0.0) -> Chance:
    return Chance(np.array(weights, float), np.array(counts, float), np.array(astray))


@pytest.mark.parametrize("kind", ["gamma", "count", "part"])
@pytest.mark.parametrize("count", [0, 1, 7, 250])
def test_one_count_has_exact_limits(kind, count: int) -> None:
    got = limits(kind, np.array(0.001 * count), moved([0.001], [count]), 0.95)
    exact = 0.0005 * np.array([chi2.ppf(0.025, 2 * count), chi2.ppf(0.975, 2 * count + 2)])
    assert_allclose(got, np.nan_to_num(exact), rtol=1e-9, atol=1e-15)


def test_the_limits_of_a_rate_as_r_has_them() -> None:
    # R 4: poisson.test(7, T = 1000)$conf.int; poisson.test(0, T = 250, conf.level = .9)$conf.int
    got = limits("gamma", np.array(0.007), moved([0.001, 0.001], [3, 4]), 0.95)
    assert_allclose(got, [0.00281436305151987, 0.0144226753617024], rtol=1e-12)
    got = limits("gamma", np.array(0.0), moved([0.004, 0.004], [0, 0]), 0.9)
    assert_allclose(got, [0, 0.011982929094216], rtol=1e-12)


def test_deaths_that_lower_a_number_mirror_those_that_raise_it() -> None:
    weights, counts = np.array([0.4, 0.1, 0.02]), np.array([1.0, 5.0, 40.0])
    up = limits("mixed", np.array(10.0), moved(weights, counts), 0.95)
    down = limits("mixed", np.array(-10.0), moved(-weights, counts), 0.95)
    assert_allclose(up.low, -down.high)
    assert_allclose(up.high, -down.low)
    assert up.high - 10 > 10 - up.low  # skew: one death weighs much


def test_a_mixed_number_allows_for_half_a_death_where_it_weighs_most() -> None:
    weights, counts = np.array([0.4, 0.1, -0.02]), np.array([1.0, 5.0, 40.0])
    got = limits("mixed", np.array(3.0), moved(weights, counts), 0.95)

    def law(mean: float, variance: float, share: float) -> float:
        return gamma.ppf(share, mean**2 / variance, scale=variance / mean)

    rises, falls = (0.9, 0.21), (0.8, 0.016)  # mean and variance of each sum
    down = rises[0] - law(*rises, 0.025), law(0.81, 0.0162, 0.975) - falls[0]
    up = law(1.1, 0.29, 0.975) - rises[0], falls[0] - law(*falls, 0.025)
    assert got.low == pytest.approx(3 - np.hypot(*down), rel=1e-9)
    assert got.high == pytest.approx(3 + np.hypot(*up), rel=1e-9)


def test_many_deaths_leave_the_normal_limits() -> None:
    rng = np.random.default_rng(1)
    weights, counts = rng.normal(size=20), rng.uniform(1e7, 2e7, 20)
    chance = moved(weights, counts, astray=3000.0)
    for level in (0.5, 0.95):
        got = limits("mixed", np.array(0.0), chance, level)
        half = norm.ppf((1 + level) / 2) * chance.se
        assert_allclose(got, [-half, half], rtol=2e-3)
    assert chance.se == pytest.approx(np.sqrt((weights**2 * counts).sum() + 9e6))


@given(
    st.sampled_from(sorted(KINDS)),
    st.lists(st.tuples(st.integers(-999, 999), st.integers(0, 50)), min_size=1, max_size=6),
    st.floats(0, 0.3),
)
def test_limits_hold_the_value_widen_with_the_level_and_stay_what_a_number_can_be(
    kind, cells, astray
) -> None:
    weights, counts = np.array(cells, float).T
    weights /= 1000
    if kind != "mixed":
        weights = np.abs(weights) / 400  # of a part of a whole, all together at most 1
    value = np.array((weights * counts).sum())
    chance = moved(weights, counts, astray)
    narrow, wide = (limits(kind, value, chance, level) for level in (0.8, 0.99))
    assert wide.low <= narrow.low <= value + 1e-12
    assert value - 1e-12 <= narrow.high <= wide.high
    assert KINDS[kind].least <= wide.low
    assert wide.high <= KINDS[kind].most
    apart = limits(kind, value, chance, 0.99, apart=True)
    assert apart.low <= wide.low
    assert apart.high >= wide.high


def test_limits_of_a_part_end_at_the_whole_and_of_a_rate_at_none() -> None:
    """Of a difference of parts they may have any sign."""
    most = moved([0.3, -0.01], [3, 2])
    assert limits("part", np.array(0.9), most, 0.95).high == 1
    assert limits("part", np.array(0.9), most, 0.95, apart=True).high > 1
    out = moved([0.001], [2], astray=0.01)
    for kind in ("part", "gamma", "count"):
        assert limits(kind, np.array(0.002), out, 0.95).low == 0
    assert limits("mixed", np.array(0.002), out, 0.95).low < 0


def test_nothing_counted_tells_no_standard_error_and_nan_passes() -> None:
    assert np.isnan(moved([0.1, 0.2], [0, 0]).se)
    low, high = limits("mixed", np.array(1.0), moved([0.1, np.nan], [3, 4]), 0.95)
    assert np.isnan([low, high]).all()


@pytest.mark.parametrize("settings", SETTINGS.values(), ids=lambda s: s.key)
def test_what_one_death_moves_is_the_gradient_over_person_years(settings) -> None:
    """Also where a group joins the one below, and for many numbers pulled back together."""
    panel = complete(gompertz_panel(people=3e5, seed=2))
    panel.exposure[9] = 0.0
    chain = run(panel, settings)
    every = list(INDICATORS.values())
    found = chances(every, chain)
    assert list(found) == [one.key for one in every if told(one)]
    for one in every:
        if one.smooth and one.unit.limits != "count":
            alone = chain.rates.per_death(gradient(one, chain))
            assert_array_equal(found[one.key].weights, alone)
            assert_array_equal(found[one.key].counts, panel.deaths)


def test_the_error_of_a_group_is_that_of_the_age_it_begins_at() -> None:
    steps = replace(PLAIN, population_error=((85, 5.0), (15, 1.5)))
    grid = AgeGrid((0, 10, 15, 80, 84, 85, 90))
    assert_array_equal(miscount(grid, steps), [0, 0, 0.015, 0.015, 0.015, 0.05, 0.05])
    assert not miscount(grid, PLAIN).any()


def test_each_population_is_out_by_itself_and_half_of_what_both_ways_move() -> None:
    here, there = gompertz_panel(people=4e5), gompertz_panel(people=9e5, level=3e-5)
    wrong = replace(PLAIN, population_error=((0, 3.0),))

    def lived(this: Panel, that: Panel) -> Array:
        return np.asarray(this.exposure.sum(axis=-1) + 2 * that.exposure.sum(axis=-1))

    assert_allclose(astray(lived, here, there, settings=wrong), np.hypot(0.03 * 4e5, 0.06 * 9e5))
    assert_array_equal(astray(lived, here, there, settings=PLAIN), 0.0)
