"""Limits of counts and of weighted sums of counts, against another law of the same quantiles."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose
from scipy.stats import chi2, poisson

from engine.count_limits import exact_limits, gamma_limits
from tests.published.denmark import rows

COUNTS = np.array([1.0, 2, 3, 7, 10, 25, 100, 1234, 1e6])
LEVELS = pytest.mark.parametrize("level", [0.8, 0.95, 0.99])


@LEVELS
def test_exact_limits_are_chi_square_quantiles(level: float) -> None:
    low, high = exact_limits(COUNTS, level)
    tail = (1 - level) / 2
    assert_allclose(low, chi2.ppf(tail, 2 * COUNTS) / 2, rtol=1e-9)
    assert_allclose(high, chi2.ppf(1 - tail, 2 * COUNTS + 2) / 2, rtol=1e-9)


@LEVELS
def test_at_an_exact_limit_the_count_has_the_chance_of_one_tail(level: float) -> None:
    few = COUNTS[:-1]
    low, high = exact_limits(few, level)
    assert_allclose(poisson.sf(few - 1, low), (1 - level) / 2, rtol=1e-8)
    assert_allclose(poisson.cdf(few, high), (1 - level) / 2, rtol=1e-8)


def test_exact_limits_are_those_of_a_statistics_program() -> None:
    printed = rows("poisson_limits.csv")
    assert len(printed) == 27
    for row in printed:
        low, high = exact_limits(np.array(float(row["count"])), float(row["level"]))
        years = float(row["person_years"])
        assert low / years == pytest.approx(float(row["low"]), rel=1e-10)
        assert high / years == pytest.approx(float(row["high"]), rel=1e-10)


def test_no_deaths_have_a_lower_limit_of_0_and_an_upper_one() -> None:
    low, high = exact_limits(np.array(0.0), 0.95)
    assert low == 0
    assert high == pytest.approx(-np.log(0.025), rel=1e-12)
    low, high = gamma_limits(np.array(0.0), np.array(0.0), np.array(0.3), 0.95)
    assert low == 0
    assert high == pytest.approx(-0.3 * np.log(0.025), rel=1e-12)


def test_a_gap_stays_one_and_a_negative_count_has_no_limits() -> None:
    got = exact_limits(np.array([np.nan, -0.5, 5.0]), 0.95)
    assert np.isnan(got.low).tolist() == np.isnan(got.high).tolist() == [True, True, False]


@given(
    deaths=st.lists(st.integers(0, 400), min_size=3, max_size=3).filter(any),
    weights=st.lists(st.floats(0.01, 50), min_size=3, max_size=3),
    scale=st.floats(1e-6, 1e6),
)
def test_limits_hold_the_value_and_scale_with_the_weights(
    deaths: list[int], weights: list[float], scale: float
) -> None:
    counts, w = np.array(deaths, float), np.array(weights)
    parts = (w * counts).sum(), (w**2 * counts).sum(), w.max()
    low, high = gamma_limits(*map(np.asarray, parts), 0.95)
    assert low < parts[0] < high
    scaled = scale * parts[0], scale**2 * parts[1], scale * parts[2]
    assert_allclose(gamma_limits(*map(np.asarray, scaled), 0.95), [scale * low, scale * high])


@given(count=st.integers(0, 10_000), weight=st.floats(1e-6, 1e3))
def test_equal_weights_give_the_exact_limits(count: int, weight: float) -> None:
    number = np.array(float(count))
    got = gamma_limits(weight * number, weight**2 * number, np.array(weight), 0.95)
    assert_allclose(got, weight * np.array(exact_limits(number, 0.95)), rtol=1e-9)


def test_where_weights_differ_the_gamma_limits_hold_their_level_or_more() -> None:
    """Fay and Feuer found them conservative; 20,000 draws, so that half a per cent shows."""
    rng = np.random.default_rng(5)
    means, weights = np.array([2.0, 5.0, 20.0]), np.array([3.0, 1.0, 0.2])
    counts = rng.poisson(means, (20_000, 3))
    low, high = gamma_limits(
        counts @ weights, counts @ weights**2, np.full(20_000, weights.max()), 0.95
    )
    truth = means @ weights
    assert 0.95 < np.mean((low <= truth) & (truth <= high)) < 0.99
    assert np.mean(truth < low) < 0.03
    assert np.mean(truth > high) < 0.03
