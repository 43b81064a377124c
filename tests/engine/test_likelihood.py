"""The search's parts: elimination against LAPACK, sums, steps that must be held back."""

import numpy as np
import pytest

from engine.hazards import GOMPERTZ, Groups
from engine.likelihood import Rows, climb, solve, total


@pytest.mark.fast
@pytest.mark.parametrize("size", [2, 3, 5])
def test_elimination_agrees_with_lapack(size: int) -> None:
    rng = np.random.default_rng(size)
    root = rng.normal(size=(7, size, size))
    matrix = root @ np.swapaxes(root, -1, -2) + 0.1 * np.eye(size)
    right = rng.normal(size=(7, size))
    found, positive = solve(matrix, right)
    np.testing.assert_allclose(found, np.linalg.solve(matrix, right[..., None])[..., 0], rtol=1e-9)
    assert positive.all()


@pytest.mark.fast
def test_which_matrices_are_positive_definite() -> None:
    """A singular or indefinite one is said to be so and stops no other."""
    singular, indefinite = np.ones((2, 2)), np.array([[1.0, 2.0], [2.0, 1.0]])
    with np.errstate(all="ignore"):
        found, positive = solve(np.stack([singular, indefinite, np.eye(2)]), np.array([1.0, 2.0]))
    assert positive.tolist() == [False, False, True]
    np.testing.assert_array_equal(found[2], [1.0, 2.0])


@pytest.mark.fast
def test_a_sum_does_not_depend_on_the_layout() -> None:
    values = np.random.default_rng(0).normal(size=(50, 103))
    np.testing.assert_array_equal(total(np.asfortranarray(values)), total(values))
    np.testing.assert_array_equal(total(values[7]), total(values)[7])


AGES = np.arange(60.5, 95)
TRUTH = np.array([-3.0, 0.11])
YEARS = np.full((1, len(AGES)), 1e4)
DEATHS = YEARS * np.exp(TRUTH[0] + TRUTH[1] * (AGES - 80))


def rows(deaths: np.ndarray = DEATHS) -> Rows:
    return Rows(GOMPERTZ, Groups(AGES, 0 * AGES, 0 * YEARS, 80.0), deaths, YEARS)


@pytest.mark.fast
@pytest.mark.parametrize("start", [(-2.0, 0.1), (3.0, 0.1), (-20.0, 0.4), (-2.0, -0.3)])
def test_the_top_is_found_from_afar(start: tuple[float, float]) -> None:
    with np.errstate(all="ignore"):
        found = climb(rows(), np.array([start]), np.zeros((1, 2), bool)).parameters
    np.testing.assert_allclose(found[0], TRUTH, rtol=1e-11)


@pytest.mark.fast
def test_a_search_begun_at_the_top_still_carries_imaginary_parts() -> None:
    """The first step is short enough to be the last but one; without the last, the derivative
    would be off by some 1e-9 of itself."""
    step = np.zeros(DEATHS.shape)
    step[0, 7] = 1.0
    start = TRUTH[None].astype(complex) + 4e-10
    found = climb(rows(DEATHS + 1e-30j * step), start, np.zeros((1, 2), bool)).parameters
    z = AGES - 80
    information = np.array([[DEATHS.sum(), (DEATHS * z).sum()], [0, (DEATHS * z * z).sum()]])
    information[1, 0] = information[0, 1]
    expected = np.linalg.solve(information, [1.0, z[7]])
    np.testing.assert_allclose(found[0].imag / 1e-30, expected, rtol=1e-12)


@pytest.mark.fast
def test_a_held_parameter_stays() -> None:
    with np.errstate(all="ignore"):
        found = climb(rows(), np.array([[-2.0, 0.08]]), np.array([[False, True]])).parameters
    level = np.log(DEATHS.sum() / (YEARS * np.exp(0.08 * (AGES - 80))).sum())
    np.testing.assert_allclose(found[0], [level, 0.08], rtol=1e-11)
