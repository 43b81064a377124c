"""Graduated rows: what no penalty moves, both ends of the penalty, dense algebra, gaps."""

import numpy as np
import pytest

from engine.graduation import PENALTIES, Graduation, graduate
from tests.engine.stepping import complex_step, largest_error

RNG = np.random.default_rng(5)
AGES = np.arange(40.0)
NOISY = np.sin(AGES / 9) + 0.2 * RNG.standard_normal((6, 40))
WEIGHTS = RNG.uniform(0.2, 3, (6, 40))
every_order = pytest.mark.parametrize("order", [1, 2, 3, 4])


def dense(weights: np.ndarray, penalty: float, order: int) -> np.ndarray:
    """The matrix W + penalty D'D."""
    differences = np.diff(np.eye(len(weights)), order, axis=0)
    return np.diag(weights) + penalty * differences.T @ differences


@every_order
@pytest.mark.parametrize("penalty", [0.3, 500.0])
def test_values_dimension_and_errors_are_those_of_dense_algebra(order: int, penalty: float) -> None:
    got = graduate(NOISY, WEIGHTS, order=order, penalty=penalty)
    for row, (values, weights) in enumerate(zip(NOISY, WEIGHTS, strict=True)):
        inverse = np.linalg.inv(dense(weights, penalty, order))
        hat = inverse * weights
        np.testing.assert_allclose(got.values[row], hat @ values, atol=1e-9)
        assert got.dimension[row] == pytest.approx(np.trace(hat), rel=1e-9)
        left = values - hat @ values
        scale = (weights * left**2).sum() / (40 - np.trace(hat))
        errors = np.sqrt(scale * np.diag(inverse))
        np.testing.assert_allclose(got.standard_errors[row], errors, rtol=1e-8)


@every_order
@pytest.mark.parametrize("penalty", [None, 1e-3, 1e4])
def test_a_polynomial_of_lower_degree_is_left_as_it_is(order: int, penalty: float | None) -> None:
    line = np.polynomial.Polynomial([3, -2, 1.5, 0.7][:order])(AGES / 20 - 1)
    got = graduate(line, WEIGHTS[0], order=order, penalty=penalty)
    np.testing.assert_allclose(got.values, line, atol=1e-6)
    bent = line + (AGES / 20 - 1) ** order
    assert np.abs(graduate(bent, WEIGHTS[0], order=order, penalty=1e4).values - bent).max() > 1e-3


@every_order
def test_without_penalty_nothing_moves_and_with_much_a_polynomial_is_left(order: int) -> None:
    loose = graduate(NOISY, WEIGHTS, order=order, penalty=1e-9)
    np.testing.assert_allclose(loose.values, NOISY, atol=1e-7)
    np.testing.assert_allclose(loose.dimension, 40, atol=1e-6)
    tight = graduate(NOISY, WEIGHTS, order=order, penalty=(1e5, 1e7, 1e8, 1e10)[order - 1])
    np.testing.assert_allclose(tight.dimension, order, atol=0.02)
    for values, weights, found in zip(NOISY, WEIGHTS, tight.values, strict=True):
        line = np.polynomial.Polynomial.fit(AGES, values, order - 1, w=np.sqrt(weights))
        np.testing.assert_allclose(found, line(AGES), atol=0.02)


@every_order
def test_weighted_moments_below_the_order_are_kept(order: int) -> None:
    got = graduate(NOISY, WEIGHTS, order=order, penalty=300.0)
    for degree in range(order):
        left = (WEIGHTS * (got.values - NOISY) * (AGES / 40) ** degree).sum(axis=-1)
        np.testing.assert_allclose(left, 0, atol=1e-8)


def test_the_penalty_has_the_least_cross_validation_of_all() -> None:
    got = graduate(NOISY, WEIGHTS)
    for row in range(6):
        scores = []
        for penalty in PENALTIES * WEIGHTS[row].mean():
            hat = np.linalg.inv(dense(WEIGHTS[row], penalty, 2)) * WEIGHTS[row]
            left = NOISY[row] - hat @ NOISY[row]
            scores.append(40 * (WEIGHTS[row] * left**2).sum() / (40 - np.trace(hat)) ** 2)
        best = PENALTIES[int(np.argmin(scores))] * WEIGHTS[row].mean()
        assert got.penalty[row] == pytest.approx(best, rel=1e-12)


def test_units_of_values_and_weights_do_not_matter() -> None:
    one, other = graduate(NOISY, WEIGHTS), graduate(NOISY * 1000, WEIGHTS * 50)
    np.testing.assert_allclose(other.values, one.values * 1000, rtol=1e-8)
    np.testing.assert_allclose(other.standard_errors, one.standard_errors * 1000, rtol=1e-6)


def test_the_errors_are_those_of_a_curve_drawn_from_the_penalty() -> None:
    """Over curves that are as rough as the penalty says, they hold what they promise."""
    rng = np.random.default_rng(2)
    curves = np.cumsum(np.cumsum(rng.standard_normal((3000, 30)) / 5, axis=-1), axis=-1)
    values = curves + rng.standard_normal(curves.shape)
    got = graduate(values, np.ones(30), penalty=25.0)
    held = np.abs(got.values - curves) < 1.96 * got.standard_errors
    assert held.mean() == pytest.approx(0.95, abs=0.015)


@every_order
def test_the_pullback_is_the_complex_step(order: int) -> None:
    g = np.random.default_rng(1).standard_normal((6, 40))

    def value(given: np.ndarray) -> np.ndarray:
        return (graduate(given, WEIGHTS, order=order, penalty=7.0).values * g).sum(axis=-1)

    pulled = graduate(NOISY, WEIGHTS, order=order, penalty=7.0).pull(g)
    assert largest_error(pulled, complex_step(value, NOISY)) < 1e-12


def test_gaps() -> None:
    weights = WEIGHTS.copy()
    values = NOISY.copy()
    weights[0, 10:13], values[0, 10:13] = 0, np.nan  # filled in
    values[1, 4] = np.nan  # a gap that has weight
    weights[2, 1:] = 0  # one number is no line
    got = graduate(values, weights)
    sound = graduate(NOISY, WEIGHTS)
    assert np.isfinite(got.values[0]).all()
    assert np.isnan(got.values[[1, 2]]).all()
    np.testing.assert_array_equal(got.values[3:], sound.values[3:])
    assert np.isfinite(graduate(values[2], weights[2], order=1, penalty=1.0).values).all()
    step = got.values[0, 9:14]  # over a gap the second differences of a cubic, hence small
    assert np.abs(np.diff(step, 4)).max() < 1e-6


def test_rows_do_not_know_one_another() -> None:
    whole = graduate(NOISY, WEIGHTS)
    square = graduate(NOISY.reshape(2, 3, 40), WEIGHTS.reshape(2, 3, 40))
    np.testing.assert_array_equal(square.values.reshape(6, 40), whole.values)
    for where in (slice(0, 1), slice(1, 4), 5):
        part: Graduation = graduate(NOISY[where], WEIGHTS[where])
        for name in ("values", "penalty", "dimension", "standard_errors"):
            np.testing.assert_array_equal(getattr(part, name), getattr(whole, name)[where])


def test_what_is_refused() -> None:
    with pytest.raises(ValueError, match="order 5; the order is 1, 2, 3 or 4"):
        graduate(NOISY, WEIGHTS, order=5)
    with pytest.raises(ValueError, match="a weight is negative"):
        graduate(NOISY, -WEIGHTS)
