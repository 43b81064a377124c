"""Smooth curves of death rates over age: Poisson regression on B-splines with a roughness penalty.

Source: Eilers & Marx (1996), Flexible smoothing with B-splines and penalties, Statistical Science
11; Currie, Durban & Eilers (2004), Statistical Modelling 4 (Poisson deaths given person-years).
Arrays inside this file are [age or coefficient, row], so that every step is one operation over all
rows; a row never learns of its neighbours, and its result does not depend on them.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array

Places = NDArray[np.intp]

PENALTIES = 10.0 ** np.arange(-1.0, 6.5, 0.5)  # from the nearly unsmoothed to a straight line
STEPS = 60  # of Fisher scoring; rows that settle leave earlier, 4 to 8 are usual
SETTLED = 1e-7  # a step so short is the last: the next would be about its square


@dataclass(frozen=True, slots=True)
class Basis:
    """Cubic B-splines on equally spaced knots over the ages low to high."""

    low: float
    high: float
    segments: int

    @property
    def size(self) -> int:
        return self.segments + 3

    def at(self, ages: Array) -> tuple[Places, Array]:
        """First of the four splines that are not 0 at each age [point], and the four [point, 4]."""
        place = (np.asarray(ages) - self.low) * self.segments / (self.high - self.low)
        first = np.clip(np.floor(place), 0, self.segments - 1)
        u = place - first
        values = ((1 - u) ** 3, 3 * u**3 - 6 * u**2 + 4, 3 * (u + u**2 - u**3) + 1, u**3)
        return first.astype(np.intp), np.stack(values, axis=-1) / 6


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
    rows = _Rows(*basis.at(ages), _rows(deaths), _rows(np.broadcast_to(exposure, deaths.shape)))
    with np.errstate(all="ignore"):  # rows that cannot be fitted end as nan
        if start is not None:
            penalty = np.broadcast_to(start.penalty, batch).reshape(-1)
            begin = _rows(np.broadcast_to(start.coefficients, (*batch, basis.size)))
            found = rows.settle(penalty, begin)
        else:
            many = len(PENALTIES)  # each row is fitted once with every penalty
            tiled = np.tile(PENALTIES, rows.deaths.shape[1])
            rows = rows.take(np.repeat(np.arange(rows.deaths.shape[1]), many))
            tried = rows.settle(tiled, rows.begin(basis.size))
            score = rows.criterion(tiled, tried).reshape(-1, many)
            best = np.argmin(np.where(np.isnan(score), np.inf, score), axis=1)
            chosen = np.arange(len(best)) * many + best
            found, penalty = tried[:, chosen], tiled[chosen]
    return Curve(basis, found.T.reshape(*batch, basis.size), penalty.reshape(batch))


@dataclass(frozen=True, slots=True)
class _Rows:
    """Counts to fit, and where their ages stand on the basis."""

    first: Places
    local: Array  # [age, 4]
    deaths: Array  # [age, row]
    exposure: Array

    def take(self, rows: Places) -> "_Rows":
        return _Rows(self.first, self.local, self.deaths[:, rows], self.exposure[:, rows])

    def begin(self, size: int) -> Array:
        """Coefficients of a first smooth through the crude log rates, half a death added."""
        overall = self.deaths.sum(axis=0) / self.exposure.sum(axis=0)
        logs = np.log((self.deaths + 0.5) / (self.exposure + 0.5 / overall))
        fitted = self.exposure * np.exp(logs)
        bands = self._bands(fitted, size) + _penalty(size, np.ones(1))
        return _solve(bands, self._weighted(fitted * logs, size))

    def settle(self, penalty: Array, begin: Array) -> Array:
        """Fisher scoring until each row's log rates stand still: [coefficient, row]."""
        found, size = begin.copy(), len(begin)
        left = np.arange(found.shape[1])
        for _ in range(STEPS):
            rows, old = self.take(left), found[:, left]
            logs = _evaluate(self.first, self.local, old)
            fitted = rows.exposure * np.exp(logs)
            bands = self._bands(fitted, size) + _penalty(size, penalty[left])
            new = _solve(bands, self._weighted(rows.deaths - fitted + fitted * logs, size))
            found[:, left] = new
            left = left[np.max(np.abs(new - old), axis=0) > SETTLED]  # nan rows stay nan
            if not left.size:
                return found
        found[:, left] = np.nan
        return found

    def criterion(self, penalty: Array, found: Array) -> Array:
        """Bayesian information criterion of fitted rows: [row]."""
        size, deaths = len(found), self.deaths
        fitted = self.exposure * np.exp(_evaluate(self.first, self.local, found))
        logs = np.where(deaths > 0, np.log(deaths / fitted), 0.0)
        deviance = 2 * (deaths * logs - deaths + fitted).sum(axis=0)
        rough = _penalty(size, penalty)
        full = np.zeros((size, size, len(penalty)))
        for d in range(3):
            for k in range(size - d):
                full[k, k + d] = full[k + d, k] = rough[d, k]
        removed = np.trace(_solve(self._bands(fitted, size) + rough, full))
        return np.asarray(deviance + np.log((self.exposure > 0).sum(axis=0)) * (size - removed))

    def _bands(self, weight: Array, size: int) -> Array:
        """Diagonals of sum_x w_x B_x B_x': [4, coefficient, row], [d, k] is that of (k, k + d)."""
        bands = np.zeros((4, size, weight.shape[1]))
        for k, splines, w in zip(self.first, self.local, weight, strict=True):
            for d in range(4):
                bands[d, k : k + 4 - d] += (splines[: 4 - d] * splines[d:])[:, None] * w
        return bands

    def _weighted(self, values: Array, size: int) -> Array:
        """sum_x B_x v_x: [coefficient, row]."""
        total = np.zeros((size, values.shape[1]))
        for k, splines, v in zip(self.first, self.local, values, strict=True):
            total[k : k + 4] += splines[:, None] * v
        return total


def _rows(array: Array) -> Array:
    """[..., age] -> [age, row], a copy in that order."""
    return np.ascontiguousarray(array.reshape(-1, array.shape[-1]).T)


def _evaluate(first: Places, local: Array, coefficients: Array) -> Array:
    value: Array = local[:, 0, None] * coefficients[first]
    for i in (1, 2, 3):
        value += local[:, i, None] * coefficients[first + i]
    return value


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
