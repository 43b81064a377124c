"""Limits within which chance in deaths leaves each age's contribution."""

from dataclasses import replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr, ndtri

from engine.ages import AgeGrid, Array
from engine.blocks import blocks
from engine.chain import Chain, run
from engine.decomposition.bends import bends
from engine.decomposition.line import by_slope
from engine.decomposition.stepwise import of_values, passed_through, stepwise
from engine.decomposition.straight import Line
from engine.indicator import Indicator
from engine.panel import Panel
from engine.settings import Settings
from engine.streams import PairDraws, pair_draws

ROUNDING = 1e-7  # of the widest: what is left of a limit at an age that the number does not read
LOST = 0.01  # share of the draws that may lack a figure

Codes = NDArray[np.str_]


class Limits(NamedTuple):
    low: Array
    high: Array


def contribution_limits(
    indicator: Indicator,
    this: Panel,
    that: Panel,
    settings: Settings,
    *,
    streams: tuple[Codes, Codes] | None = None,
    shared: Array | None = None,
    draws: int = 200,
    groups: AgeGrid | None = None,
) -> Limits:
    """Limits of the contributions along the straight line, or of the stepwise ones where the
    indicator is not smooth, at the settings' level.

    Deaths of both populations are Poisson, those counted in both (`shared`) move the two together;
    person-years and the infants' mix are taken as known. Smooth: contribution -+ z times its
    standard error by the delta method, for which the contribution of each age is derived in both
    columns of rates. Not smooth: the stepwise contributions of populations drawn anew, by keyed
    simulation, with bias-corrected percentile limits; for these `streams` are needed. With
    `groups`, a coarser grid, they are limits of the sums over its groups.

    Shape:   panels of one shape, shared [..., age], streams of this and of that [...]
             -> low, high [..., age], or [..., group].
    Missing: nan where the contribution is, where neither population has a death that moves it, and
             where more than 1 % of the draws give no figure.
    Raises:  as `contributions` and `poisson_draws`; ValueError where streams are needed and not
             given.
    Source:  Chiang (1984), The Life Table and Its Applications, chapter 8 (delta method); Efron
             (1987), Journal of the American Statistical Association 82, 171-185 (bias-corrected
             percentiles).
    """
    both = np.zeros_like(this.deaths) if shared is None else np.asarray(shared)
    if indicator.smooth:
        return _delta(indicator, this, that, settings, both, groups or this.grid)
    if streams is None:
        raise ValueError(
            f"contributions to {indicator.label} are simulated, and no streams were given"
        )
    drawn = pair_draws(this.deaths, that.deaths, both, streams, draws, "contributions")
    return _simulated(indicator, this, that, settings, drawn, groups or this.grid)


def _delta(
    indicator: Indicator,
    this: Panel,
    that: Panel,
    settings: Settings,
    shared: Array,
    groups: AgeGrid,
) -> Limits:
    """With s the mean slope on the line and A its derivative in one side's rates, a contribution
    (m - m') s moves by s at the age itself and by (m - m') A at every age."""
    line, both = Line.between(that, this, settings, indicator), (this, that)
    with np.errstate(all="ignore"):
        mean = line.mean_slope(indicator)
        own = np.moveaxis(mean[..., None] * np.eye(len(this.grid)), -1, 0)  # [moved, ..., age]
        by_death = [
            _per_death(this.grid.regroup(sign * own + line.step * bend, groups), chain)
            for sign, bend, chain in zip(
                (1, -1), bends(indicator, line, mean), (line.end, line.start), strict=True
            )
        ]
        variance = 2 * (by_death[0] * by_death[1] * shared).sum(axis=-1)
        for moved, panel in zip(by_death, both, strict=True):
            variance += (moved**2 * panel.deaths).sum(axis=-1)
        half = ndtri((1 + settings.level) / 2) * np.sqrt(np.moveaxis(variance, 0, -1))
        half = np.where(half > ROUNDING * half.max(axis=-1, keepdims=True), half, np.nan)
    found = by_slope(mean, line.step, line.difference(indicator))
    value = this.grid.regroup(found.by_age, groups)
    return Limits(value - half, value + half)


def _per_death(by_rate: Array, chain: Chain) -> Array:
    """[age moved, ..., group] in raw rates -> [group, ..., age moved] in deaths."""
    turned = np.ascontiguousarray(np.swapaxes(by_rate, 0, -1))
    return chain.rates.per_death(chain.rates.pull(turned))


def _simulated(
    indicator: Indicator,
    this: Panel,
    that: Panel,
    settings: Settings,
    drawn: PairDraws,
    groups: AgeGrid,
) -> Limits:
    """The stepwise contributions of drawn populations; choices made on the observed ones hold."""
    ours, theirs = (panel.over(lambda array: array[None]) for panel in (this, that))
    observed, found = run(passed_through(ours, theirs), settings), []
    for some in blocks(len(drawn.this), observed.rates.mx.size // len(this.grid)):
        these = replace(ours, deaths=drawn.this[some]), replace(theirs, deaths=drawn.that[some])
        with np.errstate(all="ignore"):
            passed = run(passed_through(*these), settings)
            found.append(of_values(indicator.drawn(observed, passed)).by_age)
    value = stepwise(indicator, this, that, settings).by_age
    redrawn = this.grid.regroup(np.concatenate(found), groups)
    return corrected(redrawn, this.grid.regroup(value, groups), settings.level)


def corrected(draws: Array, value: Array, level: float) -> Limits:
    """Bias-corrected percentile limits: with z0 the normal quantile of the share of draws below the
    value (those equal to it by half), the percentiles taken are those of Phi(2 z0 -+ z).

    Shape:   draws [draw, ...], value [...] -> [...].
    Missing: nan where more than 1 % of the draws are nan, where the value is, and where chance
             moves nothing.
    Source:  Efron (1987), Journal of the American Statistical Association 82, 171-185, section 2.
    """
    ordered = np.sort(draws, axis=0)  # nan last
    known = np.sum(~np.isnan(draws), axis=0)
    with np.errstate(all="ignore"):
        below = ((draws < value).sum(axis=0) + (draws == value).sum(axis=0) / 2) / known
        # a value beyond every draw is as far out as one draw more could tell
        centre = ndtri(np.clip(below, 1 / (known + 1), known / (known + 1)))
        ends = []
        for side in (-1, 1):
            tail = ndtr(2 * centre + side * ndtri((1 + level) / 2))
            place = np.clip(tail * (known + 1) - 1, 0, np.maximum(known - 1, 0))
            low = np.floor(np.nan_to_num(place)).astype(int)
            high = np.minimum(low + 1, np.maximum(known - 1, 0))
            one, next_one = (np.take_along_axis(ordered, at[None], axis=0)[0] for at in (low, high))
            ends.append(one + (place - low) * (next_one - one))
        held = (known >= (1 - LOST) * len(draws)) & np.isfinite(value) & (ends[0] < ends[1])
    return Limits(*(np.where(held, end, np.nan) for end in ends))
