"""Two mortality laws of two parameters, fitted by Poisson likelihood, many populations at once.

Both have hazard(eta) with eta = level + slope (age - centre): Gompertz mu = exp(eta), Kannisto
mu = 1 / (1 + exp(-eta)). Each population is fitted for itself: its steps stop when it has
converged, so a result does not depend on what else is in the batch.
"""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array

STEPS = 100
LONGEST_STEP = 2.0  # change of eta over the fitted ages; keeps Newton from running away
CLOSE = 1e-10  # a step so short is followed by one last full one
LEAST_AGES = 3


@dataclass(frozen=True, slots=True)
class Law:
    """A hazard as a function of eta. With mu the hazard: `relative` is d log mu / d eta, and `bend`
    its derivative in eta."""

    key: str
    hazard: Callable[[Array], Array]
    relative: Callable[[Array], Array]
    bend: Callable[[Array], Array]
    start: Callable[[Array], Array]  # eta of a rate, to begin from


GOMPERTZ = Law(
    "gompertz", np.exp, lambda mu: np.ones_like(mu), lambda mu: np.zeros_like(mu), np.log
)
KANNISTO = Law(
    "kannisto",
    lambda eta: 1 / (1 + np.exp(-eta)),
    lambda mu: 1 - mu,
    lambda mu: -mu * (1 - mu),
    lambda mu: np.log(np.minimum(np.real(mu), 0.9) / (1 - np.minimum(np.real(mu), 0.9))),
)
LAWS = {law.key: law for law in (GOMPERTZ, KANNISTO)}


@dataclass(frozen=True, slots=True)
class Symmetric:
    """A symmetric 2 x 2 matrix for each population."""

    a: Array
    b: Array  # off the diagonal
    c: Array

    def solve(self, u: Array, v: Array) -> tuple[Array, Array]:
        det = self.a * self.c - self.b * self.b
        return (self.c * u - self.b * v) / det, (self.a * v - self.b * u) / det

    @property
    def positive(self) -> NDArray[np.bool_]:
        a, b, c = (np.real(part) for part in (self.a, self.b, self.c))
        return np.asarray((a > 0) & (a * c - b * b > 0))


@dataclass(frozen=True, slots=True)
class Fit:
    """A fitted law; level and slope [...] are nan where no law could be fitted."""

    law: Law
    ages: Array  # [age], where the rates it was fitted to stand
    deaths: Array  # [..., age]
    exposure: Array
    centre: float
    level: Array
    slope: Array

    def hazard(self, ages: Array) -> Array:
        """The law at any ages: [k] -> [..., k]."""
        return self.law.hazard(self._eta(ages))

    @property
    def information(self) -> Symmetric:
        """Minus the second derivative of the log likelihood in (level, slope)."""
        return _information(self.law, self.hazard(self.ages), self, observed=True)

    def pull(self, ages: Array, g: Array) -> Array:
        """Gradient in the rates at the fitted ages, exposure held, from that in hazard(ages)."""
        mu = self.hazard(ages)
        per_eta = g * mu * self.law.relative(mu)
        return self.pull_parameters(_total(per_eta), _total(per_eta * (ages - self.centre)))

    def pull_parameters(self, g_level: Array, g_slope: Array) -> Array:
        """The same from the gradient in the two parameters, by the implicit function theorem: the
        score is 0 at the fit, so d(level, slope) = information^-1 d(score)."""
        to_level, to_slope = self.information.solve(g_level, g_slope)
        z = self.ages - self.centre
        relative = self.law.relative(self.hazard(self.ages))
        return self.exposure * relative * (to_level[..., None] + to_slope[..., None] * z)

    def _eta(self, ages: Array) -> Array:
        eta = self.level[..., None] + self.slope[..., None] * (ages - self.centre)
        return np.ascontiguousarray(eta)


def fit(law: Law, ages: Array, deaths: Array, exposure: Array) -> Fit:
    """The law of greatest Poisson likelihood, deaths ~ Poisson(exposure * mu(age)).

    Shape:   ages [age]; deaths, exposure [..., age].
    Missing: nan where a count is nan, where fewer than three ages have person-years, where there
             are no deaths, and where the likelihood has no maximum.
    Source:  Thatcher, Kannisto & Vaupel (1998), The Force of Mortality at Ages 80 to 120;
             Brillinger (1986), Biometrics 42.
    """
    deaths, exposure = np.broadcast_arrays(deaths, exposure)
    centre = float(ages.mean()) if len(ages) else 0.0
    with np.errstate(all="ignore"):
        level, slope = _maximise(law, ages - centre, deaths, exposure)
    return Fit(law, ages, deaths, exposure, centre, level, slope)


@dataclass(frozen=True, slots=True)
class _Counts:
    ages: Array
    centre: float
    deaths: Array
    exposure: Array


def _maximise(law: Law, z: Array, deaths: Array, exposure: Array) -> tuple[Array, Array]:
    counts = _Counts(z, 0.0, deaths, exposure)
    usable = np.isfinite(deaths).all(axis=-1) & np.isfinite(exposure).all(axis=-1)
    usable &= (np.real(exposure) > 0).sum(axis=-1) >= LEAST_AGES
    usable &= (np.real(deaths) > 0).any(axis=-1)
    kind = np.result_type(deaths, exposure, float)
    level = np.where(usable, law.start(_total(deaths) / _total(exposure)), np.nan).astype(kind)
    slope = np.where(usable, 0.1, np.nan).astype(kind)
    span = float(np.max(np.abs(z), initial=0.0))
    moving, done = usable.copy(), np.zeros_like(usable)
    for _ in range(STEPS):
        if not moving.any():
            break
        up, tilt = _step(law, counts, level, slope)
        size = np.abs(np.real(up)) + span * np.abs(np.real(tilt))
        brake = np.minimum(1.0, LONGEST_STEP / size)
        moving &= np.isfinite(size)
        level = np.where(moving, level + brake * up, level)
        slope = np.where(moving, slope + brake * tilt, slope)
        done |= moving & (size < CLOSE)
        moving &= ~done
    up, tilt = _step(law, counts, level, slope)
    return np.where(done, level + up, np.nan), np.where(done, slope + tilt, np.nan)


def _step(law: Law, counts: _Counts, level: Array, slope: Array) -> tuple[Array, Array]:
    """Newton's step; Fisher's where the log likelihood is not bent downwards."""
    z, D, E = counts.ages, counts.deaths, counts.exposure
    mu = law.hazard(np.ascontiguousarray(level[..., None] + slope[..., None] * z))
    residual = (D - E * mu) * law.relative(mu)
    score = _total(residual), _total(residual * z)
    observed = _information(law, mu, counts, observed=True)
    expected = _information(law, mu, counts, observed=False)
    newton, fisher = observed.solve(*score), expected.solve(*score)
    down = observed.positive
    return np.where(down, newton[0], fisher[0]), np.where(down, newton[1], fisher[1])


def _information(law: Law, mu: Array, counts: "_Counts | Fit", *, observed: bool) -> Symmetric:
    D, E, z = counts.deaths, counts.exposure, counts.ages - counts.centre
    weight = E * mu * law.relative(mu) ** 2
    if observed:
        weight = weight - (D - E * mu) * law.bend(mu)
    return Symmetric(_total(weight), _total(weight * z), _total(weight * z * z))


def _total(values: Array) -> Array:
    """Sum over age in the order of age, whatever the memory layout: the same for any batch."""
    total: Any = np.cumsum(values, axis=-1)[..., -1]
    return np.asarray(total)
