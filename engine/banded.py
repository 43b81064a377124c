"""Symmetric systems with few diagonals, many at once.

A system is kept as its diagonals, `bands [d, k, row]`: the entry (k, k + d) of the matrix of a row,
d from 0 to the half width. Rows come last, so that every step is one operation over all of them; a
row never learns of its neighbours, and its result does not depend on them.
"""

from functools import cache, reduce
from math import comb

import numpy as np

from engine.ages import Array


@cache
def roughness(size: int, order: int) -> Array:
    """D'D, D the differences of that order of `size` neighbours, as diagonals: [order + 1, size].

    >>> roughness(4, 1)
    array([[ 1.,  2.,  2.,  1.],
           [-1., -1., -1.,  0.]])
    """
    weights = np.array([(-1.0) ** i * comb(order, i) for i in range(order + 1)])
    bands = np.zeros((order + 1, size))
    for first in range(size - order):
        for d in range(order + 1):
            bands[d, first : first + order + 1 - d] += weights[: order + 1 - d] * weights[d:]
    bands.flags.writeable = False  # it is handed out again
    return bands


def added(bands: Array, more: Array) -> Array:
    """Sum of two systems, as wide as the wider one."""
    wide, narrow = (bands, more) if len(bands) >= len(more) else (more, bands)
    total = wide + np.zeros_like(narrow[:1])  # rows and kind of numbers of both
    total[: len(narrow)] += narrow
    return total


def solve(bands: Array, right: Array) -> Array:
    """Solve the systems for right sides, by elimination without pivots (they are positive).

    Shape: bands [d, k, row], right [k, row] -> the same as right.
    """
    upper, half, size = _eliminated(bands), len(bands), bands.shape[1]
    upper[1:] /= upper[0]
    value: Array = right.astype(np.result_type(bands, right))
    for k in range(size - 1):
        reach = min(half, size - k)
        value[k + 1 : k + reach] -= upper[1:reach, k] * value[k]
    value = value / upper[0]
    for k in reversed(range(size - 1)):
        reach = min(half, size - k)
        if reach > 1:
            value[k] -= total(upper[1:reach, k] * value[k + 1 : k + reach])
    return value


def inverse(bands: Array) -> Array:
    """The diagonals of the inverse that the system itself has: [d, k, row].

    The others are not made: with U'AU the factors, each entry within the bands follows from those
    to its right and below it.
    Source: Takahashi, Fagan & Chin (1973), Formation of a sparse bus impedance matrix, 8th PICA
            Conference; Erisman & Tinney (1975), Communications of the ACM 18, 177-179.
    """
    upper, half, size = _eliminated(bands), len(bands), bands.shape[1]
    upper[1:] /= upper[0]
    found = np.zeros_like(upper)
    for k in reversed(range(size)):
        reach = min(half, size - k)
        right = np.arange(1, reach)
        for d in reversed(range(reach)):
            beside = found[np.abs(d - right), k + np.minimum(d, right)]
            found[d, k] = -total(upper[right, k] * beside) if reach > 1 else 0.0
        found[0, k] += 1 / upper[0, k]
    return found


def log_determinant(bands: Array) -> Array:
    """[d, k, row] -> [row]."""
    return total(np.log(_eliminated(bands)[0]))


def _eliminated(bands: Array) -> Array:
    """The upper factor, its rows not divided by their diagonal."""
    upper, half, size = bands.copy(), len(bands), bands.shape[1]
    for k in range(size):
        for d in range(1, min(half, size - k)):
            upper[: half - d, k + d] -= upper[d, k] / upper[0, k] * upper[d:, k]
    return upper


def inner(left: Array, right: Array) -> Array:
    """Trace of the product of two such matrices, [row]; the narrower bounds the sum."""
    half = min(len(left), len(right))
    twice = np.where(np.arange(half) == 0, 1.0, 2.0)[:, None, None]
    return total((twice * left[:half] * right[:half]).reshape(half * left.shape[1], left.shape[2]))


def total(values: Array) -> Array:
    """Sum over the first axis in its order, whatever the memory layout: the same for any batch."""
    return np.asarray(reduce(np.add, values))
