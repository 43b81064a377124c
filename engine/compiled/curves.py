"""P-splines with the search for their penalty, one population after another: as engine.smoothing.

A system has four diagonals, bands [d, k] for the entries (k, k + d), as in engine.banded.
"""

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from engine.banded import roughness
from engine.compiled.jit import fused
from engine.smoothing import NEAR, ORDER, PENALTIES, SETTLED, STEPS, Basis, Curve

Places = NDArray[np.intp]


class Splines(NamedTuple):
    """The design and the roughness."""

    first: Places  # [age]; the first of the four splines that are not 0
    local: Array  # [age, 4]
    rough: Array  # [4, coefficient]


class Room(NamedTuple):
    """For one population: a curve, and the system of the step of Fisher scoring from it."""

    now: Array  # [coefficient]
    logs: Array  # [age]; log rates
    fitted: Array  # [age]; deaths
    gram: Array  # [4, coefficient]; B'WB
    right: Array  # [coefficient]; B'Wz
    bands: Array  # [4, coefficient]; with the penalty, and its factor
    next: Array  # [coefficient]
    inverse: Array  # [4, coefficient]


def fit(basis: Basis, ages: Array, deaths: Array, exposure: Array) -> Curve:
    """Curves of deaths, exposure [..., age]."""
    batch, design, size = deaths.shape[:-1], basis.at(ages), basis.size
    counts, years = (
        np.ascontiguousarray(part.reshape(-1, len(ages)), dtype=float)
        for part in (deaths, exposure)
    )
    coefficients = np.empty((len(counts), size))
    penalty = np.empty(len(coefficients))
    rough = np.zeros((4, size))
    rough[: ORDER + 1] = roughness(size, ORDER)
    splines = Splines(design.first, design.local, rough)
    shapes = (size, len(ages), len(ages), (4, size), size, (4, size), size, (4, size))
    room = Room(*(np.empty(shape) for shape in shapes))
    _fit(splines, counts, years, room, coefficients, penalty)
    return Curve(basis, coefficients.reshape(*batch, -1), penalty.reshape(batch))


@fused
def _fit(
    splines: Splines,
    deaths: Array,
    exposure: Array,
    room: Room,
    coefficients: Array,
    penalty: Array,
) -> None:
    for row in range(deaths.shape[0]):
        counts, years = deaths[row], exposure[row]
        penalty[row] = _search(splines, counts, years, room, coefficients[row])
        room.now[:] = coefficients[row]
        _weigh(splines, counts, years, room)
        _settle(splines, counts, years, penalty[row], SETTLED, room)
        coefficients[row] = room.now


@fused
def _search(splines: Splines, counts: Array, years: Array, room: Room, best: Array) -> float:
    """The penalty of the least criterion and, into `best`, its curve, near enough to compare: each
    goes on from that of the penalty before."""
    least, penalty = np.inf, PENALTIES[0]
    constant, known = _counted(counts, years), np.sum(years > 0)
    room.now[:] = np.nan
    for k in range(PENALTIES.size):
        if np.isnan(room.now[0]):
            _begin(splines, counts, years, room)
            _weigh(splines, counts, years, room)
        _settle(splines, counts, years, PENALTIES[k], NEAR, room)
        deviance = 2 * (constant + _unlike(counts, room.fitted, room.logs))
        score = deviance + math.log(known) * _dimension(splines.rough, PENALTIES[k], room)
        if k == 0 or score < least:
            least = np.inf if np.isnan(score) else score
            best[:], penalty = room.now, PENALTIES[k]
    return float(penalty)


@fused
def _counted(counts: Array, years: Array) -> float:
    """The part of half the deviance that no curve moves."""
    total = 0.0
    for x in range(counts.size):
        count = counts[x]
        total += count * np.log(count / years[x]) - count if count > 0 else 0.0 * count
    return total


@fused
def _unlike(counts: Array, fitted: Array, logs: Array) -> float:
    """The part that the curve moves, from fitted deaths and log rates."""
    total = 0.0
    for x in range(counts.size):
        total += fitted[x] - counts[x] * logs[x]
    return total


@fused
def _begin(splines: Splines, counts: Array, years: Array, room: Room) -> None:
    """A first smooth through the crude log rates, half a death added."""
    overall = counts.sum() / years.sum()
    room.gram[:], room.right[:] = 0.0, 0.0
    for x in range(counts.size):
        rate = (counts[x] + 0.5) / (years[x] + 0.5 / overall)
        weight = years[x] * rate
        _add(splines, x, weight, weight * np.log(rate), room)
    _penalise(splines.rough, 1.0, room)
    _solve(room.bands, room.right, room.now)


@fused
def _settle(
    splines: Splines, counts: Array, years: Array, penalty: float, settled: float, room: Room
) -> None:
    """Fisher scoring until the curve stands still, nan where it does not; its system is at hand
    before and after."""
    for _ in range(STEPS):
        _penalise(splines.rough, penalty, room)
        _solve(room.bands, room.right, room.next)
        moved = 0.0
        for k in range(room.now.size):
            moved = max(moved, abs(room.next[k] - room.now[k]))
            room.now[k] = room.next[k]
        _weigh(splines, counts, years, room)
        if moved <= settled or np.isnan(room.now[0]):
            return
    room.now[:] = np.nan
    _weigh(splines, counts, years, room)


@fused
def _weigh(splines: Splines, counts: Array, years: Array, room: Room) -> None:
    """The system of a step from the curve as it is, without the penalty."""
    room.gram[:], room.right[:] = 0.0, 0.0
    for x in range(counts.size):
        log_rate, place = 0.0, max(splines.first[x], 0)  # said so, no index is taken for negative
        for i in range(4):
            log_rate += splines.local[x, i] * room.now[place + i]
        room.logs[x] = log_rate
        room.fitted[x] = years[x] * np.exp(log_rate)
        working = counts[x] - room.fitted[x] + room.fitted[x] * log_rate
        _add(splines, x, room.fitted[x], working, room)


@fused
def _add(splines: Splines, x: int, weight: float, value: float, room: Room) -> None:
    """One age's part of B'WB, and of B' value."""
    place = max(splines.first[x], 0)
    for i in range(4):
        room.right[place + i] += splines.local[x, i] * value
        by = weight * splines.local[x, i]
        for j in range(i, 4):
            room.gram[j - i, place + i] += by * splines.local[x, j]


@fused
def _penalise(rough: Array, penalty: float, room: Room) -> None:
    for d in range(4):
        for k in range(rough.shape[1]):
            room.bands[d, k] = room.gram[d, k] + penalty * rough[d, k]


@fused
def _factor(bands: Array) -> None:
    """U'AU: the bands become one over the diagonal and, over it, the rows of the upper factor."""
    size = bands.shape[1]
    for k in range(size):
        reach = min(4, size - k)
        bands[0, k] = 1 / bands[0, k]
        for d in range(1, reach):
            ratio = bands[d, k] * bands[0, k]
            for j in range(d, reach):
                bands[j - d, k + d] -= ratio * bands[j, k]
        for d in range(1, reach):
            bands[d, k] *= bands[0, k]


@fused
def _solve(bands: Array, right: Array, found: Array) -> None:
    """The factor takes the place of the system."""
    _factor(bands)
    size = right.size
    found[:] = right
    for k in range(size):
        for d in range(1, min(4, size - k)):
            found[k + d] -= bands[d, k] * found[k]
    for k in range(size):
        found[k] *= bands[0, k]
    for k in range(size - 1, -1, -1):
        for d in range(min(4, size - k) - 1, 0, -1):
            found[k] -= bands[d, k] * found[k + d]


@fused
def _dimension(rough: Array, penalty: float, room: Room) -> float:
    """Effective number of coefficients; the inverse within the bands from the factor."""
    bands, inverse, size, removed = room.bands, room.inverse, rough.shape[1], 0.0
    _penalise(rough, penalty, room)
    _factor(bands)
    for k in range(size - 1, -1, -1):
        reach = min(4, size - k)
        for d in range(reach - 1, -1, -1):
            value = bands[0, k] if d == 0 else 0.0
            for j in range(1, reach):
                value -= bands[j, k] * inverse[abs(d - j), k + min(d, j)]
            inverse[d, k] = value
            removed += (1 if d == 0 else 2) * value * penalty * rough[d, k]
    return float(size - removed)
