"""Few diagonals against the whole matrix."""

import numpy as np
import pytest

from engine.banded import added, inner, inverse, log_determinant, roughness, solve

every_width = pytest.mark.parametrize("half", [1, 2, 4, 7])


def drawn(half: int, size: int = 9, rows: int = 5) -> np.ndarray:
    rng = np.random.default_rng(half)
    bands = rng.standard_normal((half, size, rows))
    bands[0] = 2 * half + rng.uniform(0, 1, (size, rows))
    for d in range(1, half):
        bands[d, size - d :] = 0
    return bands


def whole(bands: np.ndarray, row: int) -> np.ndarray:
    size = bands.shape[1]
    full = np.zeros((size, size), bands.dtype)
    for d in range(len(bands)):
        for k in range(size - d):
            full[k, k + d] = full[k + d, k] = bands[d, k, row]
    return full


@every_width
def test_solution_inverse_and_determinant(half: int) -> None:
    bands = drawn(half)
    right = np.random.default_rng(0).standard_normal((9, 5))
    found, partial, volume = solve(bands, right), inverse(bands), log_determinant(bands)
    for row in range(5):
        full = whole(bands, row)
        np.testing.assert_allclose(found[:, row], np.linalg.solve(full, right[:, row]), atol=1e-12)
        dense = np.linalg.inv(full)
        for d in range(half):
            np.testing.assert_allclose(partial[d, : 9 - d, row], np.diag(dense, d), atol=1e-12)
        assert volume[row] == pytest.approx(np.linalg.slogdet(full)[1], rel=1e-12)


def test_complex_numbers_pass() -> None:
    bands = drawn(3) + 1j * drawn(3) / 10
    right = np.random.default_rng(0).standard_normal((9, 5))
    for row in range(5):
        expected = np.linalg.solve(whole(bands, row), right[:, row])
        np.testing.assert_allclose(solve(bands, right)[:, row], expected, atol=1e-12)


@pytest.mark.parametrize("order", [1, 2, 3, 4])
def test_roughness_is_the_sum_of_squared_differences(order: int) -> None:
    values = np.random.default_rng(1).standard_normal(12)
    full = whole(roughness(12, order)[:, :, None], 0)
    assert values @ full @ values == pytest.approx((np.diff(values, order) ** 2).sum(), rel=1e-12)


def test_sums_and_traces_of_different_widths() -> None:
    one, other = drawn(2), drawn(4)
    for row in range(5):
        a, b = whole(one, row), whole(other, row)
        for pair in ((one, other), (other, one)):
            np.testing.assert_allclose(whole(added(*pair), row), a + b, atol=1e-12)
            assert inner(*pair)[row] == pytest.approx(np.trace(a @ b), rel=1e-12)
