"""P-splines with the search for their penalty, one population after another: as engine.smoothing.

A system has four diagonals, bands [d, k] for the entries (k, k + d), as in engine.banded.
"""

import math

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from engine.banded import roughness
from engine.compiled.jit import fused
from engine.smoothing import ORDER, PENALTIES, SETTLED, STEPS, Basis, Curve

Places = NDArray[np.intp]


def fit(basis: Basis, ages: Array, deaths: Array, exposure: Array) -> Curve:
    """Curves of deaths, exposure [..., age]."""
    batch, design = deaths.shape[:-1], basis.at(ages)
    counts, years = (
        np.ascontiguousarray(part.reshape(-1, len(ages)), dtype=float)
        for part in (deaths, exposure)
    )
    coefficients = np.empty((len(counts), basis.size))
    penalty = np.empty(len(coefficients))
    rough = np.zeros((4, basis.size))
    rough[: ORDER + 1] = roughness(basis.size, ORDER)
    _fit(counts, years, design.first, design.local, rough, coefficients, penalty)
    return Curve(basis, coefficients.reshape(*batch, -1), penalty.reshape(batch))


@fused
def _fit(
    deaths: Array,
    exposure: Array,
    first: Places,
    local: Array,
    rough: Array,
    coefficients: Array,
    penalty: Array,
) -> None:
    size, ages = rough.shape[1], first.size
    bands, inverse = np.empty((4, size)), np.empty((4, size))
    begin, now, right, fitted = np.empty(size), np.empty(size), np.empty(size), np.empty(ages)
    logs = np.empty(ages)
    for row in range(deaths.shape[0]):
        counted = _counted(deaths, exposure, row)
        _begin(deaths, exposure, row, first, local, rough, bands, begin)
        best = np.inf
        coefficients[row], penalty[row] = begin, PENALTIES[0]
        for k in range(PENALTIES.size):
            if k == 0 or np.isnan(now[0]):  # else on from the curve of the penalty before
                now[:] = begin
            settled = False
            weight = PENALTIES[k]
            for _ in range(STEPS):
                _normal(
                    deaths,
                    exposure,
                    row,
                    first,
                    local,
                    rough,
                    PENALTIES[k],
                    now,
                    fitted,
                    logs,
                    bands,
                    right,
                )
                _solve(bands, right)
                moved = 0.0
                for j in range(size):
                    moved = max(moved, abs(right[j] - now[j]))
                    now[j] = right[j]
                if moved <= SETTLED or np.isnan(now[0]):
                    settled = moved <= SETTLED
                    break
            if not settled:
                now[:] = np.nan
            _normal(
                deaths, exposure, row, first, local, rough, weight, now, fitted, logs, bands, right
            )
            deviance = 2 * (counted + _unlike(deaths, row, fitted, logs))
            score = _criterion(deviance, exposure, row, bands, rough, weight, inverse)
            if k == 0 or score < best:
                best = np.inf if np.isnan(score) else score
                coefficients[row], penalty[row] = now, PENALTIES[k]


@fused
def _counted(deaths: Array, exposure: Array, row: int) -> float:
    """The part of half the deviance that no curve moves."""
    total = 0.0
    for x in range(deaths.shape[1]):
        count = deaths[row, x]
        total += count * np.log(count / exposure[row, x]) - count if count > 0 else 0.0 * count
    return total


@fused
def _unlike(deaths: Array, row: int, fitted: Array, logs: Array) -> float:
    """The part that the curve moves, from fitted deaths and log rates."""
    total = 0.0
    for x in range(fitted.size):
        total += fitted[x] - deaths[row, x] * logs[x]
    return total


@fused
def _begin(
    deaths: Array,
    exposure: Array,
    row: int,
    first: Places,
    local: Array,
    rough: Array,
    bands: Array,
    begin: Array,
) -> None:
    """A first smooth through the crude log rates, half a death added."""
    counts, years = 0.0, 0.0
    for x in range(first.size):
        counts += deaths[row, x]
        years += exposure[row, x]
    bands[:] = rough
    begin[:] = 0.0
    for x in range(first.size):
        rate = (deaths[row, x] + 0.5) / (exposure[row, x] + 0.5 / (counts / years))
        _add(first[x], local, x, exposure[row, x] * rate, np.log(rate), bands, begin)
    _solve(bands, begin)


@fused
def _add(
    place: int, local: Array, x: int, weight: float, value: float, bands: Array, right: Array
) -> None:
    """One age's part of B'WB and of B'W value."""
    for i in range(4):
        by = weight * local[x, i]
        right[place + i] += by * value
        for j in range(i, 4):
            bands[j - i, place + i] += by * local[x, j]


@fused
def _normal(
    deaths: Array,
    exposure: Array,
    row: int,
    first: Places,
    local: Array,
    rough: Array,
    penalty: float,
    now: Array,
    fitted: Array,
    logs: Array,
    bands: Array,
    right: Array,
) -> None:
    """The system of one step of Fisher scoring, and the deaths and log rates fitted."""
    for d in range(4):
        for k in range(now.size):
            bands[d, k] = penalty * rough[d, k]
    right[:] = 0.0
    for x in range(first.size):
        log_rate, place = 0.0, max(first[x], 0)  # said so, no index is checked for being negative
        for i in range(4):
            log_rate += local[x, i] * now[place + i]
        logs[x] = log_rate
        fitted[x] = exposure[row, x] * np.exp(log_rate)
        working = deaths[row, x] - fitted[x] + fitted[x] * log_rate
        for i in range(4):
            right[place + i] += local[x, i] * working
            by = fitted[x] * local[x, i]
            for j in range(i, 4):
                bands[j - i, place + i] += by * local[x, j]


@fused
def _factor(bands: Array) -> None:
    """U'AU: the bands become the diagonal and, over it, the rows of the upper factor."""
    size = bands.shape[1]
    for k in range(size):
        reach = min(4, size - k)
        for d in range(1, reach):
            ratio = bands[d, k] / bands[0, k]
            for j in range(d, reach):
                bands[j - d, k + d] -= ratio * bands[j, k]
        for d in range(1, reach):
            bands[d, k] /= bands[0, k]


@fused
def _solve(bands: Array, right: Array) -> None:
    """The solution takes the place of the right side, the factor that of the system."""
    _factor(bands)
    size = right.size
    for k in range(size):
        for d in range(1, min(4, size - k)):
            right[k + d] -= bands[d, k] * right[k]
    for k in range(size):
        right[k] /= bands[0, k]
    for k in range(size - 1, -1, -1):
        for d in range(1, min(4, size - k)):
            right[k] -= bands[d, k] * right[k + d]


@fused
def _criterion(
    deviance: float,
    exposure: Array,
    row: int,
    bands: Array,
    rough: Array,
    penalty: float,
    inverse: Array,
) -> float:
    """Bayesian information criterion; the inverse within the bands from the factor."""
    known, size = 0, bands.shape[1]
    for x in range(exposure.shape[1]):
        known += exposure[row, x] > 0
    _factor(bands)
    removed = 0.0
    for k in range(size - 1, -1, -1):
        reach = min(4, size - k)
        for d in range(reach - 1, -1, -1):
            value = 1 / bands[0, k] if d == 0 else 0.0
            for j in range(1, reach):
                value -= bands[j, k] * inverse[abs(d - j), k + min(d, j)]
            inverse[d, k] = value
            removed += (1 if d == 0 else 2) * value * penalty * rough[d, k]
    return float(deviance + math.log(known) * (size - removed))
