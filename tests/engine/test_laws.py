"""The two laws: known parameters found again, a general optimiser agreed with, gradients, gaps."""

import numpy as np
import pytest
from scipy.optimize import minimize

from engine.laws import GOMPERTZ, KANNISTO, LAWS, Fit, Law, fit
from tests.engine.stepping import complex_step, largest_error

AGES = np.arange(70.5, 100)
BOTH = pytest.mark.parametrize("law", LAWS.values(), ids=LAWS)


def eta(level: float, slope: float) -> np.ndarray:
    return level + slope * (AGES - 85)


def counts(law: Law, seed: int, batch: tuple[int, ...] = (), size: float = 4000.0) -> np.ndarray:
    """Person-years that thin out, and Poisson deaths: [2, ..., age]."""
    exposure = np.broadcast_to(size * np.exp(-(((AGES - 70) / 15) ** 2)), (*batch, len(AGES)))
    drawn = np.random.default_rng(seed).poisson(law.hazard(eta(-2.2, 0.11)) * exposure)
    return np.stack([drawn.astype(float), exposure])


def by_optimiser(law: Law, deaths: np.ndarray, exposure: np.ndarray) -> np.ndarray:
    centre = AGES.mean()

    def minus_log_likelihood(at: np.ndarray) -> float:
        mu = law.hazard(at[0] + at[1] * (AGES - centre))
        return float(np.sum(exposure * mu - deaths * np.log(mu)))

    best = minimize(minus_log_likelihood, [-2.0, 0.1], method="Nelder-Mead", tol=1e-13)
    return np.asarray(best.x)


@pytest.mark.fast
@BOTH
@pytest.mark.parametrize(
    ("level", "slope"), [(-2.0, 0.1), (-4.0, 0.2), (-1.0, 0.03), (-3.0, -0.02)]
)
def test_the_law_itself_is_found_again(law: Law, level: float, slope: float) -> None:
    exposure = np.linspace(900, 3, len(AGES))
    found = fit(law, AGES, law.hazard(eta(level, slope)) * exposure, exposure)
    assert found.slope == pytest.approx(slope, rel=1e-11)
    assert found.level + found.slope * (85 - found.centre) == pytest.approx(level, rel=1e-11)


@pytest.mark.fast
@BOTH
@pytest.mark.parametrize("seed", range(3))
def test_a_general_optimiser_finds_the_same(law: Law, seed: int) -> None:
    deaths, exposure = counts(law, seed, size=300)
    found = fit(law, AGES, deaths, exposure)
    np.testing.assert_allclose(
        [found.level, found.slope], by_optimiser(law, deaths, exposure), rtol=1e-5
    )


@pytest.mark.fast
@BOTH
def test_steep_laws_are_found_too(law: Law) -> None:
    """Newton's own steps would run away from some of these."""
    levels, slopes = np.repeat([-6.0, -4.0, -2.0], 3), np.tile([0.1, 0.3, 0.4], 3)
    exposure = 1e4 * np.exp(-(((AGES - 70) / 12) ** 2))
    deaths = law.hazard(levels[:, None] + slopes[:, None] * (AGES - 85)) * exposure
    np.testing.assert_allclose(fit(law, AGES, deaths, exposure).slope, slopes, rtol=1e-9)


@pytest.mark.fast
@BOTH
def test_each_population_is_fitted_for_itself(law: Law) -> None:
    """Bit for bit, though small and large ones need different numbers of steps."""
    deaths, exposure = counts(law, 1, batch=(40,))
    deaths[:10], exposure[:10] = deaths[:10] // 40, exposure[:10] / 40
    deaths[3] = 0
    together = fit(law, AGES, deaths, exposure)
    for row in range(40):
        alone = fit(law, AGES, deaths[row], exposure[row])
        np.testing.assert_array_equal(alone.level, together.level[row])
        np.testing.assert_array_equal(alone.slope, together.slope[row])
    assert np.isnan(together.slope).sum() == 1


@pytest.mark.fast
@BOTH
def test_the_pullback_is_the_derivative(law: Law) -> None:
    deaths, exposure = counts(law, 2, batch=(3,))
    mx, beyond = deaths / exposure, np.arange(100.5, 131)
    weights = np.random.default_rng(0).normal(size=(3, len(beyond)))

    def value(at: np.ndarray) -> np.ndarray:
        return np.asarray(
            (weights * fit(law, AGES, at * exposure, exposure).hazard(beyond)).sum(axis=-1)
        )

    found = fit(law, AGES, mx * exposure, exposure).pull(beyond, weights)
    assert largest_error(found, complex_step(value, mx)) < 1e-12


@pytest.mark.fast
@BOTH
def test_the_information_is_minus_the_curvature(law: Law) -> None:
    """Its inverse is the variance of the parameters; here against differences of the score."""
    deaths, exposure = counts(law, 5)
    found = fit(law, AGES, deaths, exposure)
    z, h = AGES - found.centre, 1e-30

    def score(level: complex, slope: complex) -> np.ndarray:
        mu = law.hazard(level + slope * z)
        residual = (deaths - exposure * mu) * law.relative(mu)
        return np.array([residual.sum(), (residual * z).sum()])

    by_level = -score(found.level + 1j * h, found.slope).imag / h
    by_slope = -score(found.level, found.slope + 1j * h).imag / h
    information = found.information
    np.testing.assert_allclose(by_level, [information.a, information.b], rtol=1e-12)
    np.testing.assert_allclose(by_slope, [information.b, information.c], rtol=1e-12)
    assert information.positive


@pytest.mark.fast
@BOTH
def test_no_fit_where_there_is_nothing_to_fit(law: Law) -> None:
    deaths, exposure = counts(law, 4)
    one_age, no_years, gap = deaths * 0, exposure * 0, deaths.copy()
    one_age[-1] = 5  # the likelihood rises for ever with the slope
    no_years[:2] = 10
    gap[3] = np.nan
    found: Fit = fit(
        law,
        AGES,
        np.stack([deaths * 0, one_age, deaths, gap, deaths]),
        np.stack([exposure, exposure, no_years, exposure, exposure]),
    )
    np.testing.assert_array_equal(np.isnan(found.slope), [True, True, True, True, False])


@pytest.mark.fast
def test_shapes_of_the_two() -> None:
    """Gompertz rises without end; Kannisto's hazard stays below 1."""
    made = [
        Fit(law, AGES, AGES, AGES, 85.0, np.array(-2.0), np.array(0.1))
        for law in (GOMPERTZ, KANNISTO)
    ]
    at = np.array([85.0, 130.0])
    np.testing.assert_allclose(made[0].hazard(at), [np.exp(-2), np.exp(2.5)])
    np.testing.assert_allclose(made[1].hazard(at), [1 / (1 + np.exp(2)), 1 / (1 + np.exp(-2.5))])
