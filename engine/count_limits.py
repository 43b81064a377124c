"""Exact limits of a count, and limits of a weighted sum of counts, where deaths are Poisson."""

from typing import NamedTuple

import numpy as np
from scipy.special import gammaincinv

from engine.ages import Array


class Interval(NamedTuple):
    low: Array
    high: Array


def exact_limits(count: Array, level: float) -> Interval:
    """Limits of the mean of a Poisson count: the means at which a count as high, or as low, as this
    one would come up with the chance (1 - level) / 2.

    They are quantiles of a gamma law of the shape D, or D + 1 for the upper one, hence defined for
    parts of a count too. For a rate divide by its person-years.

    Shape:   count [...] -> [...] each.
    Missing: nan, or a count below 0, gives nan.
    Source:  Garwood (1936), Fiducial limits for the Poisson distribution, Biometrika 28, 437-442.
    >>> low, high = exact_limits(np.array([0.0, 10.0]), 0.95)
    >>> low.round(3), high.round(3)
    (array([0.   , 4.795]), array([ 3.689, 18.39 ]))
    """
    one = np.ones_like(count)
    return gamma_limits(count, count, one, level)


def gamma_limits(
    value: Array, variance: Array, largest_weight: Array, level: float, *, more: float = 1.0
) -> Interval:
    """Limits of y = sum w D, D Poisson counts and w their weights.

    With variance v = sum w^2 D and k the largest weight: the lower limit is a quantile of the gamma
    law of mean y and variance v, the upper one of that of mean y + k and variance v + k^2, as if
    one death more had fallen where it weighs most; or `more` deaths, of mean y + c k and variance
    v + c k^2.

    Where all weights are equal the limits are exact (`exact_limits`), with one death more.

    Shape:   value, variance, largest_weight [...] -> [...] each.
    Missing: nan in, nan out. Without deaths (y = v = 0) the lower limit is 0.
    Source:  Fay & Feuer (1997), Confidence intervals for directly standardized rates, Statistics in
             Medicine 16, 791-801.
    """
    tail = (1 - level) / 2
    with np.errstate(all="ignore"):
        low = _gamma_quantile(value, variance, tail)
        low = np.where((value == 0) & (variance == 0), 0.0, low)
        beyond = value + more * largest_weight, variance + more * np.square(largest_weight)
        high = _gamma_quantile(*beyond, 1 - tail)
    return Interval(low, np.where(np.isnan(low), np.nan, high))


def dobson_limits(weights: Array, counts: Array, level: float) -> Interval:
    """Limits of sum w D as far from it, in its standard errors, as the exact limits of the count of
    all deaths are from that count in its own.

    Shape:   weights, counts [..., count] -> [...] each.
    Missing: nan without deaths.
    Source:  Dobson, Kuulasmaa, Eberle & Scherer (1991), Confidence intervals for weighted sums of
             Poisson parameters, Statistics in Medicine 10, 457-462.
    """
    value, all_ = (weights * counts).sum(axis=-1), counts.sum(axis=-1)
    low, high = exact_limits(all_, level)
    with np.errstate(all="ignore"):
        per_death = np.sqrt((weights**2 * counts).sum(axis=-1) / all_)
    return Interval(value + per_death * (low - all_), value + per_death * (high - all_))


def _gamma_quantile(mean: Array, variance: Array, share: float) -> Array:
    """Quantile of the gamma law of this mean and variance.

    Squared by `np.square`, since a power of a single number is rounded otherwise than one of many.
    """
    return np.asarray(variance / mean * gammaincinv(np.square(mean) / variance, share))
