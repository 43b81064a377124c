"""Bias-corrected percentile limits."""

import numpy as np
import pytest
from scipy.stats import bootstrap, norm

from engine.decomposition.simulated import corrected


@pytest.mark.fast
def test_corrected_limits_are_those_of_another_program() -> None:
    """scipy's bias-corrected and accelerated bootstrap of a mean differs by its acceleration, which
    is 0 for symmetric samples."""
    sample = np.concatenate([np.arange(1.0, 40), -np.arange(1.0, 40)]) ** 3 + 10
    theirs = bootstrap((sample,), np.mean, n_resamples=4999, method="BCa", rng=4)
    draws = theirs.bootstrap_distribution
    ours = corrected(draws, np.array(sample.mean()), 0.95)
    np.testing.assert_allclose(ours, theirs.confidence_interval, rtol=0.02, atol=0.01 * draws.std())


@pytest.mark.fast
def test_bias_of_the_draws_is_taken_off_twice() -> None:
    """Draws centred half a standard deviation above the value: z0 = -0.5, and the limits are the
    quantiles Phi(2 z0 -+ 1.96), which lie as far below the value as the draws lie above it."""
    draws = norm.ppf(np.arange(1, 20_000) / 20_000)[:, None] + 0.5
    low, high = corrected(draws, np.zeros(1), 0.95)
    np.testing.assert_allclose([low[0], high[0]], [-0.5 - 1.96, -0.5 + 1.96], atol=0.01)
    plain = corrected(draws - 0.5, np.zeros(1), 0.95)
    np.testing.assert_allclose([plain.low[0], plain.high[0]], [-1.96, 1.96], atol=0.01)


@pytest.mark.fast
def test_corrected_limits_are_missing_where_too_many_draws_are() -> None:
    draws = np.random.default_rng(1).normal(size=(200, 4))
    draws[:2, 1] = np.nan  # 1 %
    draws[:3, 2] = np.nan
    draws[:, 3] = 0.0
    low, high = corrected(draws, np.zeros(4), 0.95)
    np.testing.assert_array_equal(np.isnan(low), [False, False, True, True])
    np.testing.assert_array_equal(np.isnan(high), np.isnan(low))
    assert np.isnan(corrected(draws, np.full(4, np.nan), 0.95).low).all()
