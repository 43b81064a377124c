"""Numbers that internationally agreed targets are stated in, from deaths by cause."""

from collections.abc import Callable
from typing import Literal

import numpy as np

from engine.ages import AgeGrid, Array
from engine.causes.counts import CauseCounts
from engine.chance import Chance, astray, limits
from engine.estimates import Estimate, Reason
from engine.panel import Panel
from engine.settings import Settings
from engine.stages.rates import death_rates

PREMATURE = AgeGrid((0, *range(30, 71, 5)))  # five-year groups from 30 to 69, and what is around
EIGHT = slice(1, 9)


def chance_30_to_70(panel: Panel, causes: CauseCounts, settings: Settings) -> Estimate:
    """The chance to die between 30 and 70 of the causes given, all others absent: with m the death
    rate of these causes together in each five-year group, q = 5 m / (1 + 2.5 m) and

        40q30 = 1 - product of (1 - q) over the eight groups.

    Shape:   panel [..., age], causes [..., cause, age], those of the target alone -> [...].
    Missing: nan with AGE_NOT_ON_GRID where a five-year group between 30 and 70 is not a sum of age
             groups; with TOO_FEW_PERSON_YEARS as the settings have it; NOT_AVAILABLE where a count
             is.
    Source:  World Health Organization, metadata of indicator 3.4.1 of the Sustainable Development
             Goals (formula and causes: I00-I99, C00-C97, E10-E14, J30-J98).
    """
    shape = panel.batch_shape
    if not all(panel.grid.has(age) for age in PREMATURE.starts):
        return _missing(shape, Reason.AGE_NOT_ON_GRID)
    own = causes.regroup(panel.grid, PREMATURE).over(lambda array: array[..., EIGHT])
    together = own.deaths.sum(axis=-2)

    def chance_of(people: Panel) -> Array:
        return 1 - _alive(together, _years(people))

    years = _years(panel)
    with np.errstate(all="ignore"):
        rates = death_rates(together, years)
        # d log (1 - q) / dm = -5 / ((1 + 2.5 m) (1 - 2.5 m))
        slope = 5 / ((1 + 2.5 * rates.mx) * (1 - 2.5 * rates.mx))
        by_rate = rates.pull(_alive(together, years)[..., None] * slope)
        weights = rates.per_death(by_rate)
    return _estimate(chance_of, weights, own, panel, settings, "part")


def _years(panel: Panel) -> Array:
    return np.ascontiguousarray(panel.grid.regroup(panel.exposure, PREMATURE)[..., EIGHT])


def _alive(deaths: Array, years: Array) -> Array:
    """Those who live from 30 to 70, of one."""
    with np.errstate(all="ignore"):
        mx = death_rates(deaths, years).mx
        return np.asarray(np.prod(1 - 5 * mx / (1 + 2.5 * mx), axis=-1))


def crude_rate(panel: Panel, causes: CauseCounts, settings: Settings) -> Estimate:
    """Deaths of the causes given over person-years, all ages together; 0 where nobody died of them.

    Shape:   panel [..., age], causes [..., cause, age] -> [...].
    Missing: as `chance_30_to_70`.
    Source:  Garwood (1936), Biometrika 28, 437-442 (exact limits).
    """

    def rate_of(people: Panel) -> Array:
        return np.asarray(causes.deaths.sum(axis=(-2, -1)) / people.exposure.sum(axis=-1))

    with np.errstate(all="ignore"):
        weights = 1 / panel.exposure.sum(axis=-1, keepdims=True) + np.zeros(len(panel.grid))
    return _estimate(rate_of, weights, causes, panel, settings, "gamma")


def _estimate(
    value_of: Callable[[Panel], Array],
    per_death: Array,
    causes: CauseCounts,
    panel: Panel,
    settings: Settings,
    kind: Literal["part", "gamma"],
) -> Estimate:
    """With the limits that chance in the deaths of the causes leaves."""
    value, weights = value_of(panel), per_death[..., None, :] * causes.worth
    flat = (*weights.shape[:-2], -1)
    out = np.broadcast_to(astray(value_of, panel, settings=settings), value.shape)
    chance = Chance(weights.reshape(flat), causes.counts.reshape(flat), out)
    few = panel.exposure.sum(axis=-1) < settings.least_exposure
    reason = np.where(few, Reason.TOO_FEW_PERSON_YEARS, Reason.NONE)
    reason = np.where(np.isfinite(value), reason, Reason.NOT_AVAILABLE).astype(np.uint8)
    low, high = limits(kind, value, chance, settings.level)
    bare = Estimate.bare(value, reason, Reason.OFTEN_LOST)
    return bare.within(low, high, chance.se, Reason.OFTEN_LOST)


def _missing(shape: tuple[int, ...], why: Reason) -> Estimate:
    gap = np.full(shape, np.nan)
    return Estimate(gap, gap, gap, np.full(shape, why, np.uint8), gap)
