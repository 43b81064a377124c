"""Limits within which chance in deaths leaves each age's contribution, and each cause's."""

from dataclasses import replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.ages import AgeGrid, Array
from engine.chain import Chain, Reading
from engine.chance import Chance, astray, limits, per_count
from engine.decomposition.bends import bends
from engine.decomposition.line import cause_steps, cells, contributions, contributions_by_cause
from engine.decomposition.simulated import Limits, stepwise_limits
from engine.decomposition.straight import Line
from engine.indicator import Indicator
from engine.panel import Panel
from engine.settings import Settings
from engine.simulation import pair_redrawn, persons
from engine.streams import PairDraws

ROUNDING = (
    1e-7  # of the widest: what is left of an interval at an age that the number does not read
)

Codes = NDArray[np.str_]
Pair = tuple[Array, Array]  # of this and of that


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
    causes: Pair | None = None,
    counted: Pair | None = None,
) -> Limits:
    """Limits of the contributions along the straight line, or of the stepwise ones where the
    indicator is not smooth, at the settings' level.

    Deaths of both populations are Poisson, those counted in both (`shared`, `Panel.counts` of whom
    both hold) move the two together;
    person-years and the infants' mix are taken as known, but for the settings' error of the
    population. Smooth: from what one death more on either side moves a contribution by, as limits
    of the indicator itself are (`engine.chance.limits`). Not smooth: bias-corrected percentiles of
    the contributions of populations drawn anew, for which `streams` are needed. With `groups`, a
    coarser grid, they are limits of the sums over its groups; with `causes`, the deaths of this and
    of that by cause, those of the contributions by cause (smooth only). Where deaths were moved
    from one cause to others, `counted` are those counted under each: chance is in them, and each
    stands for as many as its cause has at the age.

    Shape:   panels of one shape, shared [..., age], streams of this and of that [...]
             -> low, high [..., age], or [..., group]; of causes and what is shared of them
             [..., cause, age] -> [..., cause, age], or [..., cause, group].
    Missing: nan where the contribution is, at ages that the number does not read, and where more
             than 1 % of the draws give no figure.
    Raises:  as `contributions` and `poisson_draws`; ValueError where streams are needed and not
             given.
    Source:  Chiang (1984), The Life Table and Its Applications, chapter 8 (delta method), and those
             of `engine.chance.limits`; Efron (1987), Journal of the American Statistical
             Association 82, 171-185 (bias-corrected percentiles).
    """
    groups = groups or this.grid
    if causes is not None:
        return _smooth_limits(indicator, this, that, settings, causes, counted, shared, groups)
    if indicator.smooth:
        both = None if shared is None else shared[..., None, :]
        found = _smooth_limits(indicator, this, that, settings, None, None, both, groups)
        return Limits(*(end[..., 0, :] for end in found))
    if streams is None:
        raise ValueError(
            f"contributions to {indicator.label} are simulated, and no streams were given"
        )
    drawn = pair_redrawn(this, that, shared, streams, draws, "contributions")
    lived = PairDraws(
        *(
            persons(panel, np.asarray(code), draws, settings)
            for panel, code in zip((this, that), streams, strict=True)
        )
    )
    return stepwise_limits(indicator, this, that, settings, drawn, lived, groups)


def _smooth_limits(
    indicator: Indicator,
    this: Panel,
    that: Panel,
    settings: Settings,
    causes: Pair | None,
    counted: Pair | None,
    shared: Array | None,
    groups: AgeGrid,
) -> Limits:
    """[..., cause, group]; without causes there is one, with the rates that the number rests on."""
    grid, line = this.grid, Line.between(that, this, settings, indicator)
    if causes is None:
        counts = this.counts[..., None, :], that.counts[..., None, :]
        steps = line.step[..., None, :]
    else:
        counts = counted or (_as_counted(this, causes[0]), _as_counted(that, causes[1]))
        steps = cause_steps(this, that, causes)
    both = np.zeros_like(counts[0]) if shared is None else shared
    with np.errstate(all="ignore"):
        mean = line.mean_slope(indicator)
        ours, theirs = _moves(indicator, line, mean, steps, groups)
        if causes is not None and counted is not None:
            ours = _stand_for(ours, this, causes[0], counted[0])
            theirs = _stand_for(theirs, that, causes[1], counted[1])
        value = grid.regroup(cells(mean, steps, line.difference(indicator)), groups)
        chance = _chance(ours, theirs, *(_first(deaths) for deaths in (*counts, both)))
        out = _astray(indicator, this, that, settings, causes, groups)
        chance = replace(chance, astray=chance.astray + _ahead(out))
        ends = limits("mixed", _ahead(value), chance, settings.level)
    low, high = (np.moveaxis(end, (0, 1), (-1, -2)) for end in ends)
    widest = np.nanmax(high - low, axis=(-2, -1), keepdims=True, initial=0.0)
    read = high - low > ROUNDING * widest
    return Limits(np.where(read, low, np.nan), np.where(read, high, np.nan))


class _Moves(NamedTuple):
    """What one death more at an age of one side moves the contributions of a cause by, [group,
    cause, ..., age of the death]."""

    own: Array  # a death of that cause, through its own rate
    all: Array  # a death of any cause, through the slopes


def _moves(
    indicator: Reading, line: Line, mean: Array, steps: Array, groups: AgeGrid
) -> tuple[_Moves, _Moves]:
    """Of this and of that. With s the mean slope on the line and B its derivative in one side's
    rates, what a cause contributes, d s for a change d of its rate, moves by s with its own rate at
    the age, and by d B with the rates of all causes at every age."""
    grid = line.start.panel.grid
    own = np.moveaxis(mean[..., None] * np.eye(len(grid)), -1, 0)  # [moved, ..., age]
    by_end, by_start = bends(indicator, line, mean)

    def side(sign: int, bend: Array, chain: Chain, rests_on: Array) -> _Moves:
        through = grid.regroup(bend[:, None] * _first(steps), groups)
        alone = grid.regroup(sign * own, groups)[:, None]
        lent = (rests_on > 0) & (chain.rates.mx == 0)  # borrowed, hence known: no death moves it
        moving = 1.0 - np.moveaxis(lent, -1, 0)[:, None, ..., None]
        return _Moves(*(_per_death(moving * by_rate, chain) for by_rate in (alone, through)))

    return side(1, by_end, line.end, line.to_mx), side(-1, by_start, line.start, line.from_mx)


def _per_death(by_rate: Array, chain: Chain) -> Array:
    """[age moved, cause, ..., group] in raw rates -> [group, cause, ..., age moved] in deaths as
    counted."""
    turned = np.ascontiguousarray(np.swapaxes(by_rate, 0, -1))
    return per_count(chain.panel, chain.rates.per_death(chain.rates.pull(turned)))


def _stand_for(moved: _Moves, panel: Panel, causes: Array, counted: Array) -> _Moves:
    """The same where a death counted under a cause stands for others of it, moved there from other
    causes: all causes together it is still one."""
    worth = 1.0 if panel.worth is None else panel.worth[..., None, :]
    with np.errstate(all="ignore"):
        deaths = np.where(counted > 0, causes / counted / worth, 1.0)
    return _Moves(moved.own * _first(deaths), moved.all)


def _as_counted(panel: Panel, causes: Array) -> Array:
    """Deaths of each cause as counted: shared out in each as in all of the age."""
    worth = panel.worth
    return causes if worth is None else causes / worth[..., None, :]


def _chance(this: _Moves, that: _Moves, ours: Array, theirs: Array, both: Array) -> Chance:
    """Deaths [cause, ..., age] of this only, of that only and of both, each of the cause itself and
    of all others, with what one of them moves the cause's contributions by."""
    alike = _Moves(this.own + that.own, this.all + that.all)
    weights, counts = [], []
    for moved, deaths in ((this, ours - both), (that, theirs - both), (alike, both)):
        weights += [moved.own + moved.all, moved.all]
        counts += [deaths, deaths.sum(axis=0) - deaths]
    shape = weights[0].shape
    return Chance(
        np.concatenate(weights, axis=-1),
        np.concatenate([np.broadcast_to(np.maximum(one, 0.0), shape) for one in counts], axis=-1),
        np.zeros(shape[:-1]),
    )


def _astray(
    indicator: Indicator,
    this: Panel,
    that: Panel,
    settings: Settings,
    causes: Pair | None,
    groups: AgeGrid,
) -> Array:
    """Standard deviation owed to persons counted wrongly, [..., cause, group]."""

    def values(upper: Panel, lower: Panel) -> Array:
        if causes is None:
            by_cause = contributions(indicator, upper, lower, settings).by_age[..., None, :]
        else:
            found = contributions_by_cause(indicator, upper, lower, settings, causes=causes)
            by_cause = found.by_cause
        return this.grid.regroup(by_cause, groups)

    out = astray(values, this, that, settings=settings)
    return out if out.ndim else np.zeros((*this.batch_shape, 1, 1))


def _first(by_cause: Array) -> Array:
    """[..., cause, age] -> [cause, ..., age]"""
    return np.ascontiguousarray(np.moveaxis(by_cause, -2, 0))


def _ahead(by_cause: Array) -> Array:
    """[..., cause, group] -> [group, cause, ...]"""
    return np.moveaxis(by_cause, (-1, -2), (0, 1))
