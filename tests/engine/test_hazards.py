"""Terms of the laws: means over age groups by quadrature, derivatives by complex step."""

import numpy as np
import pytest
from scipy.integrate import quad

from engine.hazards import LAWS, SILER, Groups, Law, grouped, local, points

PARAMETERS = {
    "level": -2.3,
    "slope": 0.11,
    "background": -7.5,
    "infant": -4.2,
    "decline": 2.4,
}
CENTRE = 82.0
GRID = np.array([0, 1, 5, 10, 40, 80, 85, 90, 100], float)
EVERY = pytest.mark.parametrize("law", LAWS.values(), ids=LAWS)


def parameters(law: Law) -> np.ndarray:
    return np.array([PARAMETERS[name] for name in law.names])


def plain(law: Law, age: float) -> float:
    """The hazard written out."""
    p = PARAMETERS
    h = np.exp(p["level"] + p["slope"] * (age - CENTRE))
    if law.key == "kannisto":
        return float(h / (1 + h))
    if law.key != "gompertz":
        h += np.exp(p["background"])
    if law.key == "makeham_infant":
        h += np.exp(p["infant"]) * (age < 1)
    if law.key == "siler":
        h += np.exp(p["infant"] - p["decline"] * age)
    return float(h)


def groups(thinning: float = 0.0) -> Groups:
    return Groups(
        (GRID[1:] + GRID[:-1]) / 2, np.diff(GRID), np.full(len(GRID) - 1, thinning), CENTRE
    )


@pytest.mark.fast
@EVERY
def test_the_hazard_is_the_formula(law: Law) -> None:
    ages = np.array([0.0, 0.5, 3.0, 40.0, 80.0, 110.0])
    found = law.hazard(ages, parameters(law), CENTRE)
    np.testing.assert_allclose(found, [plain(law, age) for age in ages], rtol=1e-13)


@pytest.mark.fast
@EVERY
@pytest.mark.parametrize("thinning", [0.0, 0.05, 0.3, -0.02])
def test_a_group_has_the_mean_over_those_in_it(law: Law, thinning: float) -> None:
    """People thin out exponentially within the group."""
    found = local(law, groups(thinning), parameters(law)).mu
    for low, high, mu in zip(GRID, GRID[1:], found, strict=False):
        middle = (low + high) / 2

        def present(age: float, middle: float = middle) -> float:
            return float(np.exp(-thinning * (age - middle)))

        def dying(age: float) -> float:
            rate = plain(law, age)
            return present(age) * (rate / (1 - rate) if law.saturates else rate)

        mean = quad(dying, low, high, epsabs=0)[0] / quad(present, low, high, epsabs=0)[0]
        if law.key == "makeham_infant":  # its infants' excess counts no thinning within the year
            mean = pytest.approx(mean, rel=1e-2 if low == 0 and thinning else 1e-9)
            assert mu == mean
        else:
            assert mu == pytest.approx(mean / (1 + mean) if law.saturates else mean, rel=1e-9)


@pytest.mark.fast
@EVERY
@pytest.mark.parametrize("where", [groups(), groups(0.1), points(np.array([0.2, 30, 85]), CENTRE)])
def test_derivatives(law: Law, where: Groups) -> None:
    """The first by complex step from the hazard, the second from the first."""
    at, h = parameters(law), 1e-30
    here = local(law, where, at)
    for j in range(len(at)):
        beside = at.astype(complex)
        beside[j] += 1j * h
        there = local(law, where, beside)
        np.testing.assert_allclose(here.mu * here.relative[j], there.mu.imag / h, rtol=1e-11)
        for k in range(j + 1):
            slope = (there.mu * there.relative[k]).imag / h
            np.testing.assert_allclose(
                here.mu * here.bend(j, k), slope, rtol=1e-9, atol=1e-13 * here.mu.max()
            )


@pytest.mark.fast
def test_slopes_of_nothing_and_nearly_nothing_join() -> None:
    """The series near 0 and the closed form above meet, in value and both derivatives."""
    for slope in (0.0, 1e-9, 0.0399999, 0.0400001):
        at = np.array([-3.0, slope])
        wide = Groups(np.array([52.5]), np.array([5.0]), np.zeros(1), 52.5)
        here = local(LAWS["gompertz"], wide, at)
        u = 2.5 * slope
        mean = np.exp(-3.0) * (1 + u**2 / 6 + u**4 / 120 + u**6 / 5040)
        np.testing.assert_allclose(here.mu, mean, rtol=1e-12)
        np.testing.assert_allclose(
            here.mu * here.relative[1],
            2.5 * np.exp(-3.0) * (u / 3 + u**3 / 30 + u**5 / 840),
            rtol=1e-9,
            atol=1e-18,
        )
        np.testing.assert_allclose(
            here.mu * here.bend(1, 1), 6.25 * np.exp(-3.0) * (1 / 3 + u**2 / 10), rtol=1e-5
        )


@pytest.mark.fast
def test_a_background_of_0_vanishes() -> None:
    at = parameters(SILER)
    at[SILER.position("background")] = -np.inf
    here = local(SILER, groups(), at)
    small = at.copy()
    small[SILER.position("background")] = -200.0
    np.testing.assert_array_equal(here.mu, local(SILER, groups(), small).mu)
    assert all(np.isfinite(part).all() for part in here.relative)


@pytest.mark.fast
def test_people_thin_out_as_the_person_years_around_do() -> None:
    """Exactly where person-years fall exponentially; evenly where there are none beside."""
    starts = np.array([60.0, 61, 65, 70, 75])
    widths = np.array([1.0, 4, 5, 5, 5])
    middles = starts + widths / 2
    exposure = widths * np.exp(-0.08 * middles)
    np.testing.assert_allclose(grouped(middles, widths, exposure, 70.0).thinning, 0.08, rtol=1e-12)
    exposure[3] = 0.0
    found = grouped(middles, widths, exposure, 70.0).thinning
    np.testing.assert_array_equal(found[[2, 4]], 0.0)


@pytest.mark.fast
def test_a_parameter_that_is_none_of_the_laws() -> None:
    with pytest.raises(ValueError, match="Gompertz has no decline; it has level, slope"):
        LAWS["gompertz"].position("decline")
