"""Limits of stepwise contributions, by keyed simulation."""

from dataclasses import replace
from typing import NamedTuple

import numpy as np
from scipy.special import ndtr, ndtri

from engine.ages import AgeGrid, Array
from engine.blocks import blocks
from engine.chain import run
from engine.decomposition.stepwise import of_values, passed_through, stepwise
from engine.indicator import Indicator
from engine.panel import Panel
from engine.settings import Settings
from engine.streams import PairDraws

LOST = 0.01  # share of the draws that may lack a figure


class Limits(NamedTuple):
    low: Array
    high: Array


def stepwise_limits(
    indicator: Indicator,
    this: Panel,
    that: Panel,
    settings: Settings,
    drawn: PairDraws,
    groups: AgeGrid,
) -> Limits:
    """Bias-corrected percentiles of the stepwise contributions of drawn populations. Choices made
    on the observed ones, such as of a smoothing, hold.

    Shape:   drawn deaths [draw, ..., age] -> [..., group].
    Missing: as in `corrected`.
    """
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
