"""A number with its interval: by the delta method, or by simulation where it is not smooth.

An interval covers chance in deaths only: deaths are Poisson, person-years are taken as known.
"""

from collections.abc import Callable
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
from engine.stages.rates import death_rates
from engine.streams import pair_draws, poisson_draws

Codes = NDArray[np.str_]

BLOCK = 2048  # simulated tables held in memory at once
FAILED = 0.01  # share of simulated tables that may lack the number; beyond it, no interval
CHANCE = "poisson deaths"  # purpose of the streams: every number is read off the same draws
SAME = 1e-12  # of the two variances: what is left of a difference's is rounding


def estimate(
    indicator: Indicator, panel: Panel, settings: Settings, *, streams: Codes | None = None
) -> Estimate:
    """The indicator of every population with its interval at the settings' level.

    Smooth: value -+ z sqrt(sum g^2 D / E^2), g the gradient in the raw rates, D / E^2 the variance
    of a rate; of a part of a whole the same on the scale of log odds. Not smooth: quantiles of the
    values of simulated tables.

    Shape:   panel [..., age], streams [...] (the code of each population) -> [...].
    Missing: a value that may not be read is nan, with its reason. A value may stand without an
             interval: not simulated for want of streams; more than 1 % of the simulated tables
             lack the number (its reason is theirs); no deaths at all behind a smooth number.
    Source:  Chiang (1984), The Life Table and Its Applications, chapter 8 (delta method);
             Brillinger (1986), Biometrics 42 (Poisson deaths); Agresti (2013), Categorical Data
             Analysis, chapter 3 (limits on the scale of log odds); Andreev & Shkolnikov (2010),
             MPIDR Technical Report 2010-005 (simulation).
    """
    chain = run(panel, settings)
    value, reason = _read(indicator, chain)
    if indicator.smooth:
        with np.errstate(all="ignore"):
            variance = (gradient(indicator, chain) ** 2 * chain.rates.variance).sum(axis=-1)
        found = _normal(indicator, value, variance, reason, settings, nothing=Reason.NO_DEATHS)
        return _by_odds(found) if indicator.unit.part else found
    if streams is None:
        return _without(value, reason, Reason.NOT_SIMULATED)

    flat, names = _flat(panel), np.asarray(streams).ravel()

    def draw(where: slice) -> Array:
        deaths = poisson_draws(flat.deaths[where], names[where], settings.draws, CHANCE)
        return _drawn(indicator, flat[where], deaths, settings)

    return _simulated(indicator, value, reason, draw, settings)


def difference(
    indicator: Indicator,
    this: Panel,
    that: Panel,
    settings: Settings,
    *,
    shared: Array | None = None,
    streams: tuple[Codes, Codes] | None = None,
) -> Estimate:
    """The indicator of this minus that, with the interval of the difference.

    Deaths counted in both (an area and the whole it belongs to, one sex and both) move together:
    the rates of one age group covary by shared / (E this * E that). A simulation draws the shared
    deaths, those of this only and those of that only apart, from streams of their own.

    Shape:   panels of one shape on one grid, shared [..., age], streams of this and of that [...].
    Missing: as in `estimate`, the reason of this before that of that. Where all deaths are counted
             in both and chance moves the two alike, there is no sampling interval.
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
    (value, reason), (other, why) = _read(indicator, here), _read(indicator, there)
    value, reason = value - other, np.where(reason == Reason.NONE, why, reason)
    if indicator.smooth:
        with np.errstate(all="ignore"):
            g, h = gradient(indicator, here), gradient(indicator, there)
            apart = (g**2 * here.rates.variance + h**2 * there.rates.variance).sum(axis=-1)
            variance = apart - 2 * (g * h * _covariance(both, this, that)).sum(axis=-1)
        variance = np.where(variance > SAME * apart, variance, 0.0)
        nothing = np.where(apart > 0, Reason.NO_SAMPLING_INTERVAL, Reason.NO_DEATHS)
        return _normal(indicator, value, variance, reason, settings, nothing=nothing)
    if streams is None:
        return _without(value, reason, Reason.NOT_SIMULATED)
    here_flat, there_flat = _flat(this), _flat(that)
    common = both.reshape(here_flat.deaths.shape)
    names = tuple(np.asarray(side).ravel() for side in streams)

    def draw(where: slice) -> Array:
        drawn = pair_draws(
            here_flat.deaths[where],
            there_flat.deaths[where],
            common[where],
            (names[0][where], names[1][where]),
            settings.draws,
            CHANCE,
        )
        upper, lower = (
            _drawn(indicator, panel[where], deaths, settings)
            for panel, deaths in ((here_flat, drawn.this), (there_flat, drawn.that))
        )
        return upper - lower

    return _simulated(indicator, value, reason, draw, settings)


def _read(indicator: Indicator, chain: Chain) -> tuple[Array, NDArray[np.uint8]]:
    with np.errstate(all="ignore"):
        value = indicator.value(chain)
    reason = judge(indicator.needs, chain, value)
    return np.where(reason == Reason.NONE, value, np.nan), reason


def _covariance(shared: Array, this: Panel, that: Panel) -> Array:
    """Of the rates of both in one age group, [..., age]; joined groups as the rates join them."""
    empty = (this.exposure == 0) | (that.exposure == 0)
    together = death_rates(shared, np.where(empty, 0.0, 1.0)).mx
    return np.where(empty, 0.0, together / (this.exposure * that.exposure))


def _normal(
    indicator: Indicator,
    value: Array,
    variance: Array,
    reason: NDArray[np.uint8],
    settings: Settings,
    *,
    nothing: Reason | NDArray[np.int_],
) -> Estimate:
    half = ndtri((1 + settings.level) / 2) * np.sqrt(variance)
    why = np.where(np.isnan(half), indicator.needs.otherwise, nothing)
    reason = np.where((reason == Reason.NONE) & ~(half > 0), why, reason).astype(np.uint8)
    half = np.where(half > 0, half, np.nan)
    return Estimate(value, value - half, value + half, reason)


def _by_odds(symmetric: Estimate) -> Estimate:
    """The same limits carried over to log odds: there they lie as far apart to first order, and
    back on the scale of the value none passes 0 or 1."""
    value, half = symmetric.value, symmetric.high - symmetric.value
    with np.errstate(all="ignore"):
        reach = half / (value * (1 - value))
        low, high = (expit(logit(value) + side * reach) for side in (-1, 1))
    return replace(symmetric, low=low, high=high)


def _without(value: Array, reason: NDArray[np.uint8], why: Reason) -> Estimate:
    missing = np.full_like(value, np.nan)
    reason = np.where(reason == Reason.NONE, why, reason).astype(np.uint8)
    return Estimate(value, missing, missing, reason)


def _flat(panel: Panel) -> Panel:
    """The same populations in one row."""
    names = ("deaths", "exposure", "infant_weight", "infant_ratio")
    rows = int(np.prod(panel.batch_shape))
    return replace(
        panel,
        **{name: (part := getattr(panel, name)).reshape(rows, part.shape[-1]) for name in names},
    )


def _drawn(indicator: Indicator, panel: Panel, deaths: Array, settings: Settings) -> Array:
    """The indicator of simulated deaths [draw, row, age]: [draw, row]."""
    batch = deaths.shape[:-1]
    simulated = replace(
        panel,
        deaths=deaths,
        exposure=np.broadcast_to(panel.exposure, deaths.shape),
        infant_weight=np.broadcast_to(panel.infant_weight, (*batch, 2)),
        infant_ratio=np.broadcast_to(panel.infant_ratio, (*batch, 2)),
    )
    with np.errstate(all="ignore"):
        return indicator.drawn(run(panel, settings), run(simulated, settings))


def _simulated(
    indicator: Indicator,
    value: Array,
    reason: NDArray[np.uint8],
    draw: Callable[[slice], Array],
    settings: Settings,
) -> Estimate:
    """Limits from draws made block by block, so that memory does not grow with the batch."""
    rows, step = value.size, max(1, BLOCK // settings.draws)
    limits = np.full((2, rows), np.nan)
    for first in range(0, rows, step):
        where = slice(first, min(first + step, rows))
        limits[:, where] = quantiles(draw(where), settings.level)
    limits = np.where(reason == Reason.NONE, limits.reshape(2, *value.shape), np.nan)
    bare = (reason == Reason.NONE) & np.isnan(limits[0])
    reason = np.where(bare, indicator.needs.otherwise, reason).astype(np.uint8)
    return Estimate(value, limits[0], limits[1], reason)


def quantiles(values: Array, level: float) -> Array:
    """Lower and upper limit of draws [draw, row]: [2, row]; nan where too many draws are nan."""
    ordered = np.sort(values, axis=0)  # nan last
    known = np.sum(~np.isnan(values), axis=0)
    tails = np.array([(1 - level) / 2, (1 + level) / 2])[:, None]
    place = tails * np.maximum(known - 1, 0)
    below = np.floor(place).astype(int)
    above = np.minimum(below + 1, len(values) - 1)
    low, high = (np.take_along_axis(ordered, at, axis=0) for at in (below, above))
    limits = low + (place - below) * np.where(place == below, 0.0, high - low)
    return np.where(known >= (1 - FAILED) * len(values), limits, np.nan)
