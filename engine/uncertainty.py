"""Numbers with their intervals: by the delta method, or by simulation where they are not smooth.

An interval covers chance in deaths only: deaths are Poisson, person-years are taken as known.
"""

import math
from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray
from scipy.special import expit, logit, ndtri

from engine.ages import Array
from engine.chain import Chain, gradient, run
from engine.estimates import Estimate, Reason
from engine.indicator import Indicator
from engine.panel import Panel
from engine.reasons import judge
from engine.settings import Settings
from engine.streams import pair_draws, poisson_draws

Codes = NDArray[np.str_]
Draw = Callable[[Sequence[Indicator], slice], dict[str, Array]]  # of some rows: by key, [draw, row]

BLOCK = 2048  # simulated tables held in memory at once
FAILED = 0.01  # share of simulated tables that may lack the number; beyond it, no interval
CHANCE = "poisson deaths"  # purpose of the streams: every number is read off the same draws
SAME = 1e-12  # of the two variances: what is left of a difference's is rounding


def estimate(
    indicator: Indicator, panel: Panel, settings: Settings, *, streams: Codes | None = None
) -> Estimate:
    """One indicator of every population, the same alone as among others."""
    return estimates([indicator], panel, settings, streams=streams)[indicator.key]


def estimates(
    indicators: Sequence[Indicator],
    panel: Panel,
    settings: Settings,
    *,
    streams: Codes | None = None,
) -> dict[str, Estimate]:
    """Each indicator of every population with its interval at the settings' level, by its key.

    Smooth: value -+ z sqrt(sum g^2 D), g the gradient in the deaths D; of a part of a whole the
    same on the scale of log odds. Not smooth: quantiles of the values of simulated tables, all
    read off the same draws.

    Shape:   panel [..., age], streams [...] (the code of each population) -> [...].
    Missing: a value that may not be read is nan, with its reason. A value may stand without an
             interval: not simulated for want of streams; lacking in more than 1 % of the simulated
             tables; no deaths at all behind a smooth number.
    Source:  Chiang (1984), The Life Table and Its Applications, chapter 8 (delta method);
             Brillinger (1986), Biometrics 42 (Poisson deaths); Agresti (2013), Categorical Data
             Analysis, chapter 3 (limits on the scale of log odds); Andreev & Shkolnikov (2010),
             MPIDR Technical Report 2010-005 (simulation).
    """
    chain = run(panel, settings)

    def delta(one: Indicator, bare: Estimate) -> Estimate:
        with np.errstate(all="ignore"):
            half = _half((_by_death(one, chain) ** 2 * panel.deaths).sum(axis=-1), settings)
            low, high = (_by_odds if one.unit.limits == "odds" else _evenly)(bare.value, half)
        return _within(bare, low, high, Reason.NO_DEATHS)

    found = {one.key: _bare(one, chain) for one in indicators}
    found |= {one.key: delta(one, found[one.key]) for one in indicators if one.smooth}
    if streams is None:
        return found
    flat, names = _flat(panel), np.asarray(streams).ravel()

    def draw(stepped: Sequence[Indicator], where: slice) -> dict[str, Array]:
        deaths = poisson_draws(flat.deaths[where], names[where], settings.draws, CHANCE)
        return _drawn(stepped, flat[where], deaths, settings)

    return found | _simulated(indicators, found, draw, settings)


def difference(
    indicator: Indicator,
    this: Panel,
    that: Panel,
    settings: Settings,
    *,
    shared: Array | None = None,
    streams: tuple[Codes, Codes] | None = None,
) -> Estimate:
    """One indicator of this minus that, the same alone as among others."""
    return differences([indicator], this, that, settings, shared=shared, streams=streams)[
        indicator.key
    ]


def differences(
    indicators: Sequence[Indicator],
    this: Panel,
    that: Panel,
    settings: Settings,
    *,
    shared: Array | None = None,
    streams: tuple[Codes, Codes] | None = None,
) -> dict[str, Estimate]:
    """Each indicator of this minus that, with the interval of the difference, by its key.

    Deaths counted in both (an area and the whole it belongs to, one sex and both) move the two
    together: var = sum g^2 D + sum h^2 D' - 2 sum g h S, where g and h are the gradients in the
    deaths D of this and D' of that, and S those shared. A simulation draws the shared deaths, those
    of this only and those of that only apart, from streams of their own.

    Shape:   panels of one shape on one grid, shared [..., age], streams of this and of that [...].
    Missing: as in `estimates`, the reason of this before that of that. Without an interval also
             where no deaths are behind the number on one side, and where all deaths are counted in
             both and chance moves the two alike.
    Raises:  ValueError where the grids differ, or more deaths are shared than either has.
    Source:  Chiang (1984), The Life Table and Its Applications, chapter 8; covariance of sums.
    """
    if this.grid != that.grid:
        raise ValueError(
            f"the age groups differ, {this.grid.code} and {that.grid.code}; regroup both to those "
            "they have in common"
        )
    both = np.zeros_like(this.deaths) if shared is None else np.asarray(shared)
    if np.any(both > np.minimum(this.deaths, that.deaths) * (1 + SAME)):
        raise ValueError("more deaths are shared than one side has; shared deaths are in both")
    here, there = run(this, settings), run(that, settings)

    def delta(one: Indicator, bare: Estimate) -> Estimate:
        with np.errstate(all="ignore"):
            g, h = _by_death(one, here), _by_death(one, there)
            own, other = (g**2 * this.deaths).sum(axis=-1), (h**2 * that.deaths).sum(axis=-1)
            variance = own + other - 2 * (g * h * both).sum(axis=-1)
        known = (own > 0) & (other > 0)
        half = _half(np.where(known & (variance > SAME * (own + other)), variance, 0.0), settings)
        why = np.where(known, Reason.NO_SAMPLING_INTERVAL, Reason.NO_DEATHS)
        return _within(bare, *_evenly(bare.value, half), why)

    found = {one.key: _less(_bare(one, here), _bare(one, there)) for one in indicators}
    found |= {one.key: delta(one, found[one.key]) for one in indicators if one.smooth}
    if streams is None:
        return found
    here_flat, there_flat, common = _flat(this), _flat(that), both.reshape(-1, both.shape[-1])
    names = tuple(np.asarray(side).ravel() for side in streams)

    def draw(stepped: Sequence[Indicator], where: slice) -> dict[str, Array]:
        drawn = pair_draws(
            here_flat.deaths[where],
            there_flat.deaths[where],
            common[where],
            (names[0][where], names[1][where]),
            settings.draws,
            CHANCE,
        )
        upper = _drawn(stepped, here_flat[where], drawn.this, settings)
        lower = _drawn(stepped, there_flat[where], drawn.that, settings)
        return {key: upper[key] - lower[key] for key in upper}

    alike = ((this.deaths == both) & (that.deaths == both)).all(axis=-1)
    alike &= (this.exposure == that.exposure).all(axis=-1)
    return found | {
        key: _within(
            drawn,
            np.where(alike, np.nan, drawn.low),
            drawn.high,
            np.where(alike, Reason.NO_SAMPLING_INTERVAL, drawn.reason),
        )
        for key, drawn in _simulated(indicators, found, draw, settings).items()
    }


def _by_death(indicator: Indicator, chain: Chain) -> Array:
    """What one death more at each age moves, [..., age]."""
    return chain.rates.per_death(gradient(indicator, chain))


def _bare(indicator: Indicator, chain: Chain) -> Estimate:
    """The value where it may be read, without an interval."""
    with np.errstate(all="ignore"):
        value = indicator.value(chain)
    reason, gap = judge(indicator.needs, chain, value), np.full(value.shape, np.nan)
    value = np.where(reason == Reason.NONE, value, np.nan)
    return _within(Estimate(value, gap, gap, reason), gap, gap, Reason.NOT_SIMULATED)


def _less(this: Estimate, that: Estimate) -> Estimate:
    reason = np.where(np.isfinite(this.value), that.reason, this.reason)
    return replace(this, value=this.value - that.value, reason=reason)


def _half(variance: Array, settings: Settings) -> Array:
    """Half the interval's width; nan where chance moves nothing."""
    half = ndtri((1 + settings.level) / 2) * np.sqrt(variance)
    return np.where(half > 0, half, np.nan)


def _evenly(value: Array, half: Array) -> tuple[Array, Array]:
    return value - half, value + half


def _by_odds(value: Array, half: Array) -> tuple[Array, Array]:
    """Limits as far apart to first order on the scale of log odds: none passes 0 or 1."""
    centre, reach = logit(value), half / (value * (1 - value))
    return expit(centre - reach), expit(centre + reach)


def _within(bare: Estimate, low: Array, high: Array, why: Reason | NDArray[np.int_]) -> Estimate:
    """A value with its limits; `why` is the reason where it stands without them."""
    known, held = np.isfinite(bare.value), np.isfinite(low) & np.isfinite(high)
    reason = np.where(known, np.where(held, Reason.NONE, why), bare.reason).astype(np.uint8)
    low, high = (np.where(known & held, limit, np.nan) for limit in (low, high))
    return Estimate(bare.value, low, high, reason)


def _flat(panel: Panel) -> Panel:
    """The same populations in one row."""
    rows = math.prod(panel.batch_shape)
    return panel.over(lambda array: array.reshape(rows, array.shape[-1]))


def _drawn(
    indicators: Sequence[Indicator], panel: Panel, deaths: Array, settings: Settings
) -> dict[str, Array]:
    """The indicators of simulated deaths [draw, row, age]: by key, [draw, row]."""
    batch = deaths.shape[:-1]
    copies = panel.over(lambda array: np.broadcast_to(array, (*batch, array.shape[-1])))
    simulated = replace(copies, deaths=deaths)
    with np.errstate(all="ignore"):
        observed, drawn = run(panel, settings), run(simulated, settings)
        return {one.key: one.drawn(observed, drawn) for one in indicators}


def _simulated(
    indicators: Sequence[Indicator], bare: dict[str, Estimate], draw: Draw, settings: Settings
) -> dict[str, Estimate]:
    """What is not smooth, with limits from draws made block by block, so that memory does not grow
    with the batch."""
    stepped = [one for one in indicators if not one.smooth]
    if not stepped:
        return {}
    shape, step = bare[stepped[0].key].value.shape, max(1, BLOCK // settings.draws)
    rows = math.prod(shape)
    limits = {one.key: np.full((2, rows), np.nan) for one in stepped}
    for first in range(0, rows, step):
        where = slice(first, min(first + step, rows))
        for key, values in draw(stepped, where).items():
            limits[key][:, where] = quantiles(values, settings.level)
    return {
        key: _within(bare[key], low.reshape(shape), high.reshape(shape), Reason.OFTEN_LOST)
        for key, (low, high) in limits.items()
    }


def quantiles(values: Array, level: float) -> Array:
    """Lower and upper limit of draws [draw, row]: [2, row]; nan where too many draws are nan.

    A further draw falls between two neighbours of n with the chance 1 / (n + 1): so are the ranks
    counted, and the limits hold the level.
    """
    ordered = np.sort(values, axis=0)  # nan last
    known = np.sum(~np.isnan(values), axis=0)
    tails = np.array([(1 - level) / 2, (1 + level) / 2])[:, None]
    place = np.clip(tails * (known + 1) - 1, 0, np.maximum(known - 1, 0))
    below = np.floor(place).astype(int)
    above = np.minimum(below + 1, len(values) - 1)
    low, high = (np.take_along_axis(ordered, at, axis=0) for at in (below, above))
    limits = low + (place - below) * np.where(place == below, 0.0, high - low)
    return np.where(known >= (1 - FAILED) * len(values), limits, np.nan)
