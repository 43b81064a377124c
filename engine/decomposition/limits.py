"""Limits within which chance in deaths leaves each age's contribution."""

from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr, ndtri

from engine.ages import AgeGrid, Array
from engine.blocks import blocks
from engine.chain import Chain, run
from engine.decomposition.bends import bends
from engine.decomposition.line import cause_steps, cells
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
    causes: tuple[Array, Array] | None = None,
) -> Limits:
    """Limits of the contributions along the straight line, or of the stepwise ones where the
    indicator is not smooth, at the settings' level.

    Deaths of both populations are Poisson, those counted in both (`shared`) move the two together;
    person-years and the infants' mix are taken as known. Smooth: contribution -+ z times its
    standard error by the delta method, for which the contribution of each age is derived in both
    columns of rates. Not smooth: the stepwise contributions of populations drawn anew, by keyed
    simulation, with bias-corrected percentile limits; for these `streams` are needed. With
    `groups`, a coarser grid, they are limits of the sums over its groups; with `causes`, the deaths
    of this and of that by cause, those of the contributions by cause (smooth only), deaths of
    different causes moving by chance of their own.

    Shape:   panels of one shape, shared [..., age], streams of this and of that [...]
             -> low, high [..., age], or [..., group]; of causes and what is shared of them
             [..., cause, age] -> [..., cause, age], or [..., cause, group].
    Missing: nan where the contribution is, where neither population has a death that moves it, and
             where more than 1 % of the draws give no figure.
    Raises:  as `contributions` and `poisson_draws`; ValueError where streams are needed and not
             given.
    Source:  Chiang (1984), The Life Table and Its Applications, chapter 8 (delta method); Efron
             (1987), Journal of the American Statistical Association 82, 171-185 (bias-corrected
             percentiles).
    """
    groups = groups or this.grid
    if causes is not None:
        in_both = np.zeros_like(causes[0]) if shared is None else shared
        steps = cause_steps(this, that, causes)
        return _delta(indicator, this, that, settings, steps, (*causes, in_both), groups)
    in_both = np.zeros_like(this.deaths) if shared is None else shared
    if indicator.smooth:
        one_cause = [deaths[..., None, :] for deaths in (this.deaths, that.deaths, in_both)]
        found = _delta(indicator, this, that, settings, None, one_cause, groups)
        return Limits(*(end[..., 0, :] for end in found))
    if streams is None:
        raise ValueError(
            f"contributions to {indicator.label} are simulated, and no streams were given"
        )
    drawn = pair_draws(this.deaths, that.deaths, in_both, streams, draws, "contributions")
    return _simulated(indicator, this, that, settings, drawn, groups)


def _delta(
    indicator: Indicator,
    this: Panel,
    that: Panel,
    settings: Settings,
    steps: Array | None,
    deaths: Sequence[Array],
    groups: AgeGrid,
) -> Limits:
    """With s the mean slope on the line and B its derivative in one side's rates, what a cause
    contributes, d s for a change d of its rate, moves by s with its own rate at the age, and by d B
    with the rates of all causes at every age.

    `deaths` of this, of that and of both are [..., cause, age]; without `steps`, the changes of the
    causes' rates, there is one cause, and its rates are those of the line.
    """
    line = Line.between(that, this, settings, indicator)
    steps = line.step[..., None, :] if steps is None else steps
    with np.errstate(all="ignore"):
        mean = line.mean_slope(indicator)
        own = np.moveaxis(mean[..., None] * np.eye(len(this.grid)), -1, 0)
        moves = [
            _Moves(
                _per_death(this.grid.regroup(sign * own, groups), chain)[:, None],
                _per_death(this.grid.regroup(bend[:, None] * _first(steps), groups), chain),
            )
            for sign, bend, chain in zip(
                (1, -1), bends(indicator, line, mean), (line.end, line.start), strict=True
            )
        ]
        ours, theirs, both = (_first(counts) for counts in deaths)
        variance = _together(moves[0], moves[0], ours) + _together(moves[1], moves[1], theirs)
        variance += 2 * _together(moves[0], moves[1], both)
        half = ndtri((1 + settings.level) / 2) * np.sqrt(np.moveaxis(variance, (0, 1), (-1, -2)))
        widest = half.max(axis=(-2, -1), keepdims=True)
        half = np.where(half > ROUNDING * widest, half, np.nan)
    value = this.grid.regroup(cells(mean, steps, line.difference(indicator)), groups)
    return Limits(value - half, value + half)


class _Moves(NamedTuple):
    """What one death more at an age moves the contributions of a cause by, [group, cause, ..., age
    of the death]."""

    own: Array  # a death of that cause, through its own rate
    all: Array  # a death of any cause, through the slopes


def _together(one: _Moves, other: _Moves, deaths: Array) -> Array:
    """The covariance that deaths [cause, ..., age] in both give them, [group, cause, ...]."""
    by_own = one.own * other.own + one.own * other.all + one.all * other.own
    return np.asarray((by_own * deaths + one.all * other.all * deaths.sum(axis=0)).sum(axis=-1))


def _first(by_cause: Array) -> Array:
    """[..., cause, age] -> [cause, ..., age]"""
    return np.ascontiguousarray(np.moveaxis(by_cause, -2, 0))


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
