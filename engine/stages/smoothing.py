"""Death rates of adults left as they are, or smoothed over age."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from engine.ages import AgeGrid, Array
from engine.settings import Settings
from engine.smoothing import Basis, fit
from engine.stages.rates import Rates

ADULT = 10  # below, rates fall steeply from birth to their lowest: no one roughness fits both sides
KNOTS = 5  # years between the knots of the smooth curve
LEAST_GROUPS = 4  # that a curve is fitted to


@dataclass(frozen=True, slots=True)
class Smoothed:
    """Rates on the grid they came on."""

    mx: Array  # [..., age]
    pull: Callable[[Array], Array]  # gradient in these rates -> in those that came in


class AdultCounts(NamedTuple):
    """The closed groups from 10, each rate standing for the hazard at its group's middle."""

    basis: Basis
    ages: Array  # [group]
    deaths: Array  # [..., group]
    exposure: Array


def as_counted(grid: AgeGrid, rates: Rates, settings: Settings) -> Smoothed:
    """The rates as they are."""
    return Smoothed(rates.mx, lambda g: g)


def smooth(grid: AgeGrid, rates: Rates, settings: Settings) -> Smoothed:
    """Rates of the closed groups from 10 read off a smooth curve; the others are kept.

    A group's rate stands for the hazard at its middle before and after, so that the width of the
    groups moves nothing. The sum of deaths over the smoothed ages is kept (and, where the knots are
    as the ages, nearly their mean age): a smooth curve moves deaths between ages, not away.

    Missing: the smoothed rates are nan where a count is nan, where nobody died at these ages, and
             where the grid has fewer than four such groups.
    """
    groups = adult_groups(grid)
    if groups.stop - groups.start < LEAST_GROUPS:
        missing = np.full_like(rates.mx[..., groups], np.nan)
        return Smoothed(_placed(rates.mx, groups, missing), lambda g: g * np.nan)
    fitted, mids = fit(*adult_counts(grid, rates)), grid.mids[groups]
    with np.errstate(all="ignore"):
        curve = np.exp(fitted.log_rates(mids))

    def pull(g: Array) -> Array:
        if g.ndim > curve.ndim:  # of several numbers
            return np.stack([pull(one) for one in g])
        with np.errstate(all="ignore"):
            through = fitted.pull(mids, g[..., groups] * curve)
        return _placed(g, groups, np.where((g[..., groups] != 0).any(-1)[..., None], through, 0.0))

    return Smoothed(_placed(rates.mx, groups, curve), pull)


def adult_groups(grid: AgeGrid) -> slice:
    """The closed groups that begin at 10 or later."""
    return slice(sum(start < ADULT for start in grid.starts), len(grid) - 1)


def adult_counts(grid: AgeGrid, rates: Rates) -> AdultCounts:
    """What the smooth curve of those groups is fitted to, and its splines."""
    groups = adult_groups(grid)
    low, high = grid.starts[groups.start], grid.open_age
    basis = Basis(low, high, max(4, round((high - low) / KNOTS)))
    exposure = np.ascontiguousarray(rates.exposure[..., groups])
    return AdultCounts(basis, grid.mids[groups], rates.mx[..., groups] * exposure, exposure)


def _placed(values: Array, groups: slice, inside: Array) -> Array:
    below, above = values[..., : groups.start], values[..., groups.stop :]
    return np.concatenate([below, inside, above], axis=-1)


SMOOTHINGS: dict[str, Callable[[AgeGrid, Rates, Settings], Smoothed]] = {
    "none": as_counted,
    "p_spline": smooth,
}
