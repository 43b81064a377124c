"""Graduation: a row of numbers over age or time drawn smooth, each held as far as its weight goes.

Source: Whittaker (1923), On a new method of graduation, Proceedings of the Edinburgh Mathematical
Society 41, 63-75; Henderson (1924), A new method of graduation, Transactions of the Actuarial
Society of America 25, 29-40.
"""

from dataclasses import dataclass

import numpy as np

from engine.ages import Array
from engine.banded import added, inverse, roughness, solve, total

PENALTIES = 10.0 ** np.arange(-2.0, 8.5, 0.5)  # in mean weights; beyond, rounding tells


@dataclass(frozen=True, slots=True)
class Graduation:
    """Graduated values, and what they were made of."""

    values: Array  # [..., age]
    given: Array  # [..., age]; 0 where without weight
    weights: Array  # [..., age]
    order: int
    penalty: Array  # [...]

    @property
    def dimension(self) -> Array:
        """Effective number of free values, trace of (W + penalty D'D)^-1 W: [...]."""
        return np.asarray(total(_last_first(self.weights * self._spread)))

    @property
    def scale(self) -> Array:
        """Variance of a number of weight one: weighted squares left over, by the freedom left."""
        left = (self.weights > 0).sum(axis=-1) - self.dimension
        return np.asarray(_squares(self) / left)

    @property
    def standard_errors(self) -> Array:
        """Of the graduated values, [..., age]: Bayesian, scale times (W + penalty D'D)^-1."""
        return np.sqrt(self.scale[..., None] * self._spread)

    def pull(self, g: Array) -> Array:
        """Gradient in the given numbers, weights and penalty held: [..., age] -> [..., age]."""
        return self.weights * _solved(self.weights, self.penalty, self.order, g)

    @property
    def _spread(self) -> Array:
        bands = _bands(self.weights, self.penalty.ravel(), self.order)
        return np.asarray(inverse(bands)[0].T.reshape(self.weights.shape))


def graduate(
    values: Array, weights: Array, *, order: int = 2, penalty: float | Array | None = None
) -> Graduation:
    """The numbers z with the least sum w (z - values)^2 + penalty * sum (differences of z)^2.

    Differences are of that order: polynomials of lower degree are left as they are. Without a
    penalty the one of PENALTIES, times the row's mean weight, is taken that has the least n RSS /
    (n - dimension)^2 (generalised cross-validation, which needs weights only up to a factor).

    Shape:   values, weights [..., age], penalty [...] -> [..., age].
    Missing: a number without weight is filled in and may be nan; another nan makes its row nan, and
             so do fewer weights than `order`.
    Raises:  ValueError where a weight is negative or the order is not from 1 to 4.
    Source:  as above; Golub, Heath & Wahba (1979), Technometrics 21, 215-223 (the penalty).
    >>> graduate(np.array([1.0, 2, 3, np.nan]), np.array([1, 1, 1, 0]), penalty=5).values.round(6)
    array([1., 2., 3., 4.])
    """
    values, weights = np.broadcast_arrays(values, np.asarray(weights, float))
    if np.any(weights < 0):
        raise ValueError("a weight is negative; weights are at least 0")
    if order not in (1, 2, 3, 4):
        raise ValueError(f"differences of order {order}; the order is 1, 2, 3 or 4")
    given = np.where(weights > 0, values, 0.0)
    poor = (weights > 0).sum(axis=-1) < order
    if penalty is None:
        return _searched(given, np.where(poor[..., None], np.nan, weights), order)
    held = np.array(np.broadcast_to(np.where(poor, np.nan, penalty), given.shape[:-1]))
    return _graduated(given, weights, held, order)


def _graduated(given: Array, weights: Array, penalty: Array, order: int) -> Graduation:
    values = _solved(weights, penalty, order, weights * given)
    return Graduation(values, given, weights, order, penalty)


def _searched(given: Array, weights: Array, order: int) -> Graduation:
    """The penalty of least generalised cross-validation for each row, then its values."""
    unit = total(_last_first(weights)) / weights.shape[-1]
    shape = (*given.shape[:-1], len(PENALTIES), given.shape[-1])
    numbers, held = (
        np.broadcast_to(part[..., None, :], shape) for part in (np.real(given), weights)
    )
    tried = _graduated(numbers, held, unit[..., None] * PENALTIES, order)
    with np.errstate(all="ignore"):
        known = (tried.weights > 0).sum(axis=-1)
        score = known * _squares(tried) / (known - tried.dimension) ** 2
    best = np.argmin(np.where(np.isnan(score), np.inf, score), axis=-1)
    return _graduated(given, weights, np.asarray(unit * PENALTIES[best]), order)


def _squares(graduation: Graduation) -> Array:
    left = np.real(graduation.values - graduation.given)
    return total(_last_first(graduation.weights * left**2))


def _solved(weights: Array, penalty: Array, order: int, right: Array) -> Array:
    """(W + penalty D'D)^-1 right, [..., age]."""
    rows = right.reshape(-1, right.shape[-1]).T
    found = solve(_bands(weights, penalty.ravel(), order), rows)
    return np.ascontiguousarray(found.T).reshape(right.shape)


def _bands(weights: Array, penalty: Array, order: int) -> Array:
    size = weights.shape[-1]
    rough = roughness(size, order)[:, :, None] * penalty
    return added(rough, weights.reshape(-1, size).T[None])


def _last_first(array: Array) -> Array:
    return np.moveaxis(array, -1, 0)
