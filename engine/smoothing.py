"""Smooth curves of death rates over age: Poisson regression on B-splines with a roughness penalty.

Source: Eilers & Marx (1996), Flexible smoothing with B-splines and penalties, Statistical Science
11; Currie, Durban & Eilers (2004), Statistical Modelling 4 (Poisson deaths given person-years).
Arrays inside this file are [age or coefficient, row], so that every step is one operation over all
rows; a row never learns of its neighbours, and its result does not depend on them.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from engine.ages import Array

PENALTIES = 10.0 ** np.arange(-1.0, 6.5, 0.5)  # from the nearly unsmoothed to a straight line
STEPS = 60  # of Fisher scoring; rows that settle leave earlier, 4 to 8 are usual
SETTLED = 1e-9  # largest change of a log rate in the last step


@dataclass(frozen=True, slots=True)
class Basis:
    """Cubic B-splines on equally spaced knots over the ages low to high."""

    low: float
    high: float
    segments: int

    @property
    def size(self) -> int:
        return self.segments + 3

    def at(self, ages: Array) -> tuple[Array, Array]:
        """First of the four splines that are not 0 at each age, and the four values:
        [point] -> [point] whole numbers, [point, 4]."""
        place = (np.asarray(ages) - self.low) * self.segments / (self.high - self.low)
        first = np.clip(np.floor(place), 0, self.segments - 1)
        u = place - first
        values = ((1 - u) ** 3, 3 * u**3 - 6 * u**2 + 4, 3 * (u + u**2 - u**3) + 1, u**3)
        return first.astype(int), np.stack(values, axis=-1) / 6


@dataclass(frozen=True, slots=True)
class Curve:
    """A smooth curve of log rates for each population; nan where the fit did not settle."""

    basis: Basis
    coefficients: Array  # [..., coefficient]
    penalty: Array  # [...], weight of the roughness

    def log_rates(self, ages: Array) -> Array:
        """[point] -> [..., point]."""
        rows = _rows(self.coefficients)
        values = _evaluate(*self.basis.at(ages), rows)
        return values.T.reshape(*self.penalty.shape, len(ages))


def fit(
    basis: Basis,
    ages: Array,
    deaths: Array,
    exposure: Array,
    *,
    start: Curve | None = None,
) -> Curve:
    """Penalised Poisson fit of log rates: deaths ~ Poisson(exposure * exp(curve(age))).

    The penalty is the sum of squared second differences of the coefficients; its weight is the one
    of PENALTIES with the least Bayesian information criterion, deviance + log(ages) * effective
    dimension. With `start`, its weight is kept and the fit begins from its coefficients: so are
    simulated counts fitted, whose smoothing was chosen on the counts observed.

    Shape:   ages [age], deaths, exposure [..., age], `start` broadcasts -> curves [...].
    Missing: nan in, nan out; an age with exposure of 0 has no weight; no deaths at all gives nan.
    """
    batch = deaths.shape[:-1]
    first, local = basis.at(ages)
    counts, years = _rows(deaths), _rows(np.broadcast_to(exposure, deaths.shape))
    if start is not None:
        weight = np.broadcast_to(start.penalty, batch).reshape(-1)
        begin = _rows(np.broadcast_to(start.coefficients, (*batch, basis.size)))
        found = _settle(first, local, counts, years, weight, begin)
        return Curve(basis, found.T.reshape(*batch, basis.size), weight.reshape(batch))
    many = len(PENALTIES)
    weight = np.tile(PENALTIES, counts.shape[1])
    counts, years = np.repeat(counts, many, axis=1), np.repeat(years, many, axis=1)
    found = _settle(first, local, counts, years, weight, _start(first, local, counts, years))
    score = _criterion(first, local, counts, years, weight, found).reshape(-1, many)
    best = np.argmin(np.where(np.isnan(score), np.inf, score), axis=1)
    chosen = np.arange(len(best)) * many + best
    return Curve(basis, found[:, chosen].T.reshape(*batch, -1), weight[chosen].reshape(batch))


def _rows(array: Array) -> Array:
    """[..., age] -> [age, row], a copy in that order."""
    return np.ascontiguousarray(array.reshape(-1, array.shape[-1]).T)


def _evaluate(first: Array, local: Array, coefficients: Array) -> Array:
    value: Array = local[:, 0, None] * coefficients[first]
    for i in (1, 2, 3):
        value += local[:, i, None] * coefficients[first + i]
    return value


def _start(first: Array, local: Array, deaths: Array, exposure: Array) -> Array:
    """Coefficients of a first smooth through the crude log rates, half a death added to each."""
    with np.errstate(all="ignore"):
        overall = deaths.sum(axis=0) / exposure.sum(axis=0)
        logs = np.log((deaths + 0.5) / (exposure + 0.5 / overall))
        fitted = exposure * np.exp(logs)
    size = first[-1] + 4
    bands = _bands(first, local, fitted, size) + _penalty(size, np.ones(1))
    return _solve(bands, _weighted(first, local, fitted * logs, size))


def _settle(
    first: Array, local: Array, deaths: Array, exposure: Array, weight: Array, begin: Array
) -> Array:
    """Fisher scoring until each row's log rates stand still: [coefficient, row]."""
    found = begin.copy()
    left = np.arange(found.shape[1])
    with np.errstate(all="ignore"):
        for _ in range(STEPS):
            old, size = found[:, left], len(found)
            logs = _evaluate(first, local, old)
            fitted = exposure[:, left] * np.exp(logs)
            bands = _bands(first, local, fitted, size) + _penalty(size, weight[left])
            pull = deaths[:, left] - fitted + fitted * logs
            new = _solve(bands, _weighted(first, local, pull, size))
            found[:, left] = new
            left = left[np.max(np.abs(new - old), axis=0) > SETTLED]  # nan rows stay nan
            if not left.size:
                return found
    found[:, left] = np.nan
    return found


def _criterion(
    first: Array, local: Array, deaths: Array, exposure: Array, weight: Array, found: Array
) -> Array:
    """Bayesian information criterion of fitted rows: [row]."""
    size = len(found)
    with np.errstate(all="ignore"):
        fitted = exposure * np.exp(_evaluate(first, local, found))
        logs = np.where(deaths > 0, np.log(deaths / fitted), 0.0)
        deviance: Array = 2 * (deaths * logs - deaths + fitted).sum(axis=0)
        rough = _penalty(size, weight)
        bands = _bands(first, local, fitted, size) + rough
        full = np.zeros((size, size, len(weight)))  # the penalty as a full matrix, column by column
        for d in range(4):
            for k in range(size - d):
                full[k, k + d] = full[k + d, k] = rough[d, k]
        removed = np.trace(_solve(bands, full))
        deviance += np.log((exposure > 0).sum(axis=0)) * (size - removed)
        return deviance


def _bands(first: Array, local: Array, weight: Array, size: int) -> Array:
    """Diagonals of sum_x w_x B_x B_x': [4, coefficient, row], [d, k] standing for (k, k + d)."""
    bands = np.zeros((4, size, weight.shape[1]))
    for x, k in enumerate(first):
        for d in range(4):
            bands[d, k : k + 4 - d] += (local[x, : 4 - d] * local[x, d:])[:, None] * weight[x]
    return bands


def _weighted(first: Array, local: Array, values: Array, size: int) -> Array:
    """sum_x B_x v_x: [coefficient, row]."""
    total = np.zeros((size, values.shape[1]))
    for x, k in enumerate(first):
        total[k : k + 4] += local[x][:, None] * values[x]
    return total


def _penalty(size: int, weight: Array) -> Array:
    """Weight times D'D, D the second differences, as diagonals: [4, coefficient, row]."""
    differences = np.diff(np.eye(size), 2, axis=0)
    square = differences.T @ differences
    diagonals: Sequence[Array] = [np.append(np.diag(square, d), np.zeros(d)) for d in range(4)]
    return np.stack(diagonals)[:, :, None] * weight


def _solve(bands: Array, right: Array) -> Array:
    """Solve symmetric systems given by their diagonals, by elimination without pivots.

    bands [4, coefficient, row], right [coefficient, ..., row] -> the same as right.
    """
    upper, value, size = bands.copy(), right.copy(), bands.shape[1]
    for k in range(size):
        for d in range(1, min(4, size - k)):
            ratio = upper[d, k] / upper[0, k]
            upper[: 4 - d, k + d] -= ratio * upper[d:, k]
            value[k + d] -= ratio * value[k]
    for k in reversed(range(size)):
        for d in range(1, min(4, size - k)):
            value[k] -= upper[d, k] * value[k + d]
        value[k] /= upper[0, k]
    return value
