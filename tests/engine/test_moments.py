"""Means over ages at death: groups at their mean age, the open group exponential."""

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import exp1

from engine.ages import AgeGrid
from engine.moments import group_means, group_slopes
from engine.tables import from_rates

GRID = AgeGrid((0, 1, 5, 10, 80))
AX = np.array([[0.2, 1.6, 2.5, 40.0, 6.0], [0.1, 1.5, 2.5, 35.0, 25.0]])
TABLE = from_rates(GRID, np.array([0.01, 0.002, 0.001, 0.012, 0.1]), AX)


def test_a_closed_group_is_read_at_its_mean_age() -> None:
    np.testing.assert_allclose(
        group_means(TABLE, lambda x: x**3)[..., :-1], (np.array([0, 1, 5, 10]) + AX[:, :-1]) ** 3
    )


@pytest.mark.parametrize("power", [0, 1, 2, 5])
def test_powers_in_the_open_group_are_exact(power: int) -> None:
    for row, mean in enumerate(AX[:, -1]):
        exact, _ = quad(lambda t, m=mean: (80 + t * m) ** power * np.exp(-t), 0, 200, epsabs=0)
        got = group_means(TABLE, lambda x: x**power)[row, -1]
        assert got == pytest.approx(exact, rel=1e-12)


def test_the_mean_logarithm_beyond_the_open_age_is_an_exponential_integral() -> None:
    z = 80 / AX[:, -1]
    exact = np.log(80) + np.exp(z) * exp1(z)
    np.testing.assert_allclose(group_means(TABLE, np.log)[..., -1], exact, rtol=1e-13)


def test_slopes_are_those_of_the_means() -> None:
    for reading, slope in ((np.log, lambda x: 1 / x), (lambda x: x**2, lambda x: 2 * x)):
        stepped = from_rates(GRID, TABLE.mx, AX + 1e-30j)
        np.testing.assert_allclose(
            group_slopes(TABLE, slope), group_means(stepped, reading).imag / 1e-30, rtol=1e-12
        )
