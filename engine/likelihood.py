"""The greatest Poisson likelihood of a law, by Newton's steps, many populations at once."""

from dataclasses import dataclass, replace
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import xlogy

from engine.ages import Array
from engine.hazards import Groups, Law, Local, local

Flags = NDArray[np.bool_]

STEPS = 60
LONGEST_STEP = 2.0  # change of the logarithm of a rate; keeps Newton from running away
CLOSE = 1e-8  # a step so short is followed by one last full one
SLACK = 1e-11  # by this part of its terms a log likelihood may fall from rounding
VANISHED = -30.0  # logarithm of a rate that is on its way to 0, and is held there from here on
FIRST_DAMPING, LEAST_DAMPING, MOST_DAMPING = 1e-2, 1e-3, 1e12


@dataclass(frozen=True, slots=True)
class Rows:
    """Populations one below the other, and the law set against them."""

    law: Law
    groups: Groups
    deaths: Array  # [row, age]
    exposure: Array

    def __getitem__(self, where: Any) -> "Rows":
        groups = replace(self.groups, thinning=self.groups.thinning[where])
        return Rows(self.law, groups, self.deaths[where], self.exposure[where])


@dataclass(frozen=True, slots=True)
class _Place:
    """Where the search of each row stands."""

    at: Array  # [row, parameter]
    height: Array  # [row], log likelihood, but for a constant
    score: Array  # its derivative
    bend: Array  # minus its second one, or the expectation of that where the true one misleads


class Top(NamedTuple):
    """Where the likelihood is greatest, each [row, parameter]."""

    parameters: Array
    held: Flags  # at its start, or at 0


def climb(rows: Rows, start: Array, held: Flags) -> Top:
    """The parameters of greatest likelihood, each row for itself, `held` ones kept at their start.

    Newton's steps (Fisher's where the log likelihood is not bent downwards), shortened where they
    are long and damped after one that led down (Levenberg's way). Near the top they are full, so
    that counts with an imaginary part carry it through exactly. The rate of a term that the steps
    shrink to nothing is set to 0, its logarithm to minus infinity, and held.

    Shape:   start, held [row, parameter] -> the same.
    Missing: a start of nan is not followed; nan where the steps do not settle.
    Source:  Fletcher (1987), Practical Methods of Optimization, chapters 3 and 5.
    """
    found, held = np.full(start.shape, np.nan, start.dtype), held.copy()
    moving = np.flatnonzero(~np.isnan(np.real(start)).any(axis=-1))
    place = _place(rows[moving], start[moving], held[moving])
    damping = np.zeros(len(moving))
    for _ in range(STEPS):
        if not len(moving):
            break
        part, fixed = rows[moving], held[moving]
        step = solve(place.bend * _more(damping, start.shape[-1]), place.score).values
        size = _size(rows, place.at, step)
        brake = np.minimum(1.0, LONGEST_STEP / size)[:, None]
        ahead = _place(part, _moved(place.at, brake * step, fixed), fixed)
        slack = SLACK * (np.abs(place.height) + total(np.real(part.deaths)))
        up = ahead.height >= place.height - slack
        done = up & (size < CLOSE) & (damping == 0)
        last = solve(ahead.bend[done], ahead.score[done]).values
        found[moving[done]] = _moved(ahead.at[done], last, fixed[done])
        place = _chosen(up, ahead, place)
        damping = np.where(
            up,
            np.where(damping > LEAST_DAMPING, damping / 10, 0.0),
            10 * damping + FIRST_DAMPING,
        )
        gone = _vanished(rows.law, place.at, fixed)
        if gone.any():
            held[moving] |= gone
            place = _place(part, np.where(gone, -np.inf, place.at), fixed | gone)
        going = ~done & np.isfinite(size) & (damping < MOST_DAMPING)
        moving, damping = moving[going], damping[going]
        place = _Place(*(getattr(place, name)[going] for name in _Place.__slots__))
    return Top(found, held)


def information(here: Local, deaths: Array, exposure: Array, held: Flags) -> Array:
    """Minus the second derivative of the log likelihood, [..., parameter, parameter]; of one held,
    that of the unit matrix."""
    residual = deaths - exposure * here.mu
    return _symmetric(
        [
            [
                total(deaths * here.relative[j] * here.relative[k] - residual * here.bend(j, k))
                for k in range(j + 1)
            ]
            for j in range(len(here.relative))
        ],
        held,
    )


def _expected(here: Local, exposure: Array, held: Flags) -> Array:
    """The expectation of the information under the law."""
    weight = exposure * here.mu
    return _symmetric(
        [
            [total(weight * here.relative[j] * here.relative[k]) for k in range(j + 1)]
            for j in range(len(here.relative))
        ],
        held,
    )


def _symmetric(triangle: list[list[Array]], held: Flags) -> Array:
    k = len(triangle)
    parts = [triangle[max(i, j)][min(i, j)] for i in range(k) for j in range(k)]
    matrix = np.stack(parts, axis=-1).reshape(*parts[0].shape, k, k)
    return np.where(held[..., None] | held[..., None, :], np.eye(k), matrix)


class Solution(NamedTuple):
    values: Array  # [..., k]
    positive: Flags  # [...], whether the matrix is positive definite


def solve(matrix: Array, right: Array) -> Solution:
    """The solution for each population, and whether its symmetric matrix is positive definite:
    elimination without pivots, entry by entry, so that no population meets another and one without
    a solution stops no other.

    Shape:   matrix [..., k, k], right [..., k], which broadcast -> [...].
    """
    k = matrix.shape[-1]
    a = [[matrix[..., i, j] for j in range(k)] for i in range(k)]
    b = [right[..., i] for i in range(k)]
    positive = np.ones(matrix.shape[:-2], bool)
    for i in range(k):
        positive &= np.real(a[i][i]) > 0
        for row in range(i + 1, k):
            factor = a[row][i] / a[i][i]
            b[row] = b[row] - factor * b[i]
            for j in range(i + 1, k):
                a[row][j] = a[row][j] - factor * a[i][j]
    for i in reversed(range(k)):
        for j in range(i + 1, k):
            b[i] = b[i] - a[i][j] * b[j]
        b[i] = b[i] / a[i][i]
    return Solution(np.stack(b, axis=-1), positive)


def total(values: Array) -> Array:
    """Sum over age in the order of age, whatever the memory layout: the same for any batch."""
    summed: Any = np.cumsum(values, axis=-1)[..., -1]
    return np.asarray(summed)


def _place(rows: Rows, at: Array, held: Flags) -> _Place:
    here = local(rows.law, rows.groups, at)
    deaths, exposure = rows.deaths, rows.exposure
    residual = deaths - exposure * here.mu
    score = np.stack([total(residual * part) for part in here.relative], axis=-1)
    height = total(xlogy(np.real(deaths), np.real(here.mu)) - np.real(exposure * here.mu))
    bend = information(here, deaths, exposure, held)
    down = solve(bend, score).positive
    if not down.all():
        bend = np.where(down[:, None, None], bend, _expected(here, exposure, held))
    return _Place(at, height, np.where(held, 0.0, score), bend)


def _moved(at: Array, step: Array, held: Flags) -> Array:
    return np.where(held, at, at + step)


def _chosen(up: Flags, ahead: _Place, behind: _Place) -> _Place:
    def chosen(name: str) -> Array:
        new, old = getattr(ahead, name), getattr(behind, name)
        return np.asarray(np.where(up.reshape(-1, *(1,) * (new.ndim - 1)), new, old))

    return _Place(*(chosen(name) for name in _Place.__slots__))


def _more(damping: Array, size: int) -> Array:
    """By what the diagonal of each matrix is multiplied."""
    return 1 + damping[:, None, None] * np.eye(size)


def _size(rows: Rows, at: Array, step: Array) -> Array:
    """The most that a step moves the logarithm of a term where it counts, [row]."""
    reach = float(np.max(np.abs(rows.groups.middles - rows.groups.centre), initial=0.0))
    size = np.zeros(len(at))
    for j, name in enumerate(rows.law.names):
        scale = {"slope": reach, "decline": 1 / np.maximum(np.abs(np.real(at[:, j])), 0.05)}
        size = size + np.abs(np.real(step[:, j])) * scale.get(name, 1.0)
    return size


def _vanished(law: Law, at: Array, held: Flags) -> Flags:
    """Terms that may be 0 and have come close to it, [row, parameter]."""
    bounded = np.isin(np.arange(len(law.names)), list(law.bounded))
    return np.asarray((np.real(at) < VANISHED) & bounded & ~held)
