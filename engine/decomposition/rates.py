"""A difference of two weighted death rates: how much is owed to the weights, how much to rates."""

from dataclasses import dataclass

import numpy as np

from engine.ages import Array
from engine.decomposition.straight import require_one_grid
from engine.panel import Panel
from engine.stages.rates import death_rates


@dataclass(frozen=True, slots=True)
class RateParts:
    """The difference of two weighted rates, this minus that; both parts add up to it."""

    composition: Array  # [..., age], owed to the share that an age has among people
    rate: Array  # [..., age], owed to its death rate
    difference: Array  # [...], per person-year


def kitagawa(rates: tuple[Array, Array], weights: tuple[Array, Array]) -> RateParts:
    """The difference of sum w m, this minus that: (w - w') (m + m') / 2 is the part of the age
    composition, (m - m') (w + w') / 2 that of the rates.

    Only the sum of the composition's part has a meaning of its own: an age's share can grow only as
    others shrink. With common weights (a standardised rate) it is 0 at every age.

    Shape:   rates and weights of this and of that, each [..., age]; broadcast.
    Missing: nan in, nan out, but a rate that has no weight on its own side is not needed there: the
             other side's stands for it.
    Source:  Kitagawa (1955), Journal of the American Statistical Association 50, 1168-1194.
    >>> parts = kitagawa((np.array([0.01, 0.04]), np.array([0.02, 0.04])),
    ...                  (np.array([0.5, 0.5]), np.array([0.75, 0.25])))
    >>> parts.composition.sum().round(6), parts.rate.sum().round(6)
    (np.float64(0.00625), np.float64(-0.00625))
    """
    ours, theirs = rates
    with np.errstate(invalid="ignore"):
        ours, theirs = (
            np.where((share == 0) & np.isnan(mine), other, mine)
            for share, mine, other in zip(weights, rates, (theirs, ours), strict=True)
        )
        composition = (weights[0] - weights[1]) * (ours + theirs) / 2
        rate = (ours - theirs) * (weights[0] + weights[1]) / 2
    return RateParts(composition, rate, (composition + rate).sum(axis=-1))


def of_crude_rates(this: Panel, that: Panel) -> RateParts:
    """The difference of two crude death rates, each age weighted by its share of person-years.

    Shape:   panels [..., age] on one grid.
    Missing: nan where a count is, or where there are no person-years at all.
    Raises:  ValueError where the grids differ.
    Source:  Kitagawa (1955), Journal of the American Statistical Association 50, 1168-1194.
    """
    require_one_grid(this, that)
    sides = (this, that)
    with np.errstate(invalid="ignore"):
        shares = tuple(one.exposure / one.exposure.sum(axis=-1, keepdims=True) for one in sides)
    rates = tuple(death_rates(one.deaths, one.exposure).mx for one in sides)
    return kitagawa((rates[0], rates[1]), (shares[0], shares[1]))
