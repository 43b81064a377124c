"""Limits of numbers that jump, from tables simulated block by block."""

import math
from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr, ndtri

from engine.ages import Array
from engine.chain import run
from engine.chance import miscount, told
from engine.estimates import Estimate, Reason
from engine.indicator import Indicator
from engine.panel import Panel
from engine.settings import Settings
from engine.streams import PairDraws, normal_draws, pair_draws, poisson_draws

Draw = Callable[[Sequence[Indicator], slice], dict[str, Array]]  # of some rows: by key, [draw, row]

BLOCK = 2048  # simulated tables held in memory at once
MISCOUNT = "population error"  # purpose of the streams by which person-years are drawn
FAILED = 0.01  # share of simulated tables that may lack the number; beyond it, no interval


def simulated(
    indicators: Sequence[Indicator], bare: dict[str, Estimate], draw: Draw, settings: Settings
) -> dict[str, Estimate]:
    """What is not smooth, with limits from draws made block by block, so that memory does not grow
    with the batch.

    On each side the wider of two limits is taken, of the draws' own quantiles and of those
    corrected for bias, for each fails where the other holds: plain ones hold the shortest age span
    of half the deaths in 83 to 88 of 100 small populations with single ages, corrected ones the
    single age with most deaths in 87 to 88. Limits reflected about the value would hold the age
    group with most deaths in 64 to 80, since a number that jumps has its draws on one side of it.

    Missing: no interval where more than 1 % of the draws lack the number.
    """
    stepped = [one for one in indicators if not told(one)]
    if not stepped:
        return {}
    shape, step = bare[stepped[0].key].value.shape, max(1, BLOCK // settings.draws)
    rows = math.prod(shape)
    observed = {one.key: bare[one.key].value.ravel() for one in stepped}
    limits = {one.key: np.full((3, rows), np.nan) for one in stepped}
    for first in range(0, rows, step):
        where = slice(first, min(first + step, rows))
        for key, values in draw(stepped, where).items():
            limits[key][:2, where] = widest(values, observed[key][where], settings.level)
            limits[key][2, where] = spread(values)
    return {
        key: bare[key].within(
            low.reshape(shape), high.reshape(shape), se.reshape(shape), Reason.OFTEN_LOST
        )
        for key, (low, high, se) in limits.items()
    }


def drawn(
    indicators: Sequence[Indicator],
    panel: Panel,
    deaths: Array,
    settings: Settings,
    streams: NDArray[np.str_],
) -> dict[str, Array]:
    """The indicators of simulated deaths [draw, row, age]: by key, [draw, row].

    Where the settings say that persons are counted wrongly, person-years are drawn too: in each
    table all ages are out by one and the same number of standard deviations.
    """
    batch = deaths.shape[:-1]
    copies = panel.over(lambda array: np.broadcast_to(array, (*batch, array.shape[-1])))
    lived = persons(panel, streams, len(deaths), settings)
    counts = replace(copies, deaths=deaths, exposure=lived, counted=None)
    with np.errstate(all="ignore"):
        observed, redrawn = run(panel, settings), run(counts, settings)
        return {one.key: one.drawn(observed, redrawn) for one in indicators}


def redrawn(panel: Panel, streams: NDArray[np.str_], draws: int, purpose: str) -> Array:
    """Deaths as chance might have had them: those counted are drawn, and others shared out by them
    as before. [draw, ..., age]"""
    return _shared_out(panel, poisson_draws(panel.counts, streams, draws, purpose))


def pair_redrawn(
    this: Panel,
    that: Panel,
    shared: Array | None,
    streams: tuple[NDArray[np.str_], NDArray[np.str_]],
    draws: int,
    purpose: str,
) -> PairDraws:
    """The same of two populations, `shared` the counts that stand in both (`Panel.counts`)."""
    in_both = np.zeros_like(this.deaths) if shared is None else shared
    drawn = pair_draws(this.counts, that.counts, in_both, streams, draws, purpose)
    return PairDraws(_shared_out(this, drawn.this), _shared_out(that, drawn.that))


def _shared_out(panel: Panel, counts: Array) -> Array:
    """Deaths from those counted, [draw, ..., age]."""
    worth = panel.worth
    return counts if worth is None else counts * worth


def persons(panel: Panel, streams: NDArray[np.str_], draws: int, settings: Settings) -> Array:
    """Person-years as they might be, were persons counted wrongly as the settings say: in each draw
    all ages are out by one and the same number of standard deviations. [draw, ..., age]"""
    error, shape = miscount(panel.grid, settings), (draws, *panel.deaths.shape)
    if not error.any():
        return np.broadcast_to(panel.exposure, shape)
    out = normal_draws(streams, draws, MISCOUNT)[..., None]
    return np.asarray(panel.exposure * np.exp(error * out))


def flat(panel: Panel) -> Panel:
    """The same populations in one row."""
    rows = math.prod(panel.batch_shape)
    return panel.over(lambda array: array.reshape(rows, array.shape[-1]))


def spread(values: Array) -> Array:
    """Standard deviation of the draws [draw, row] that have the number: [row]."""
    known = ~np.isnan(values)
    count = np.maximum(known.sum(axis=0), 2)
    # summed in the order of the draws, not in that of the memory: so a batch is its rows
    mean = np.cumsum(np.where(known, values, 0.0), axis=0)[-1] / count
    squares = np.cumsum(np.where(known, (values - mean) ** 2, 0.0), axis=0)[-1]
    return np.asarray(np.sqrt(squares / (count - 1)))


def corrected(values: Array, observed: Array, level: float) -> Array:
    """Lower and upper limit of draws [draw, row] about the values observed [row]: [2, row].

    With z0 the normal quantile of the share of draws below the value (of those equal to it half
    count), the percentiles taken are those of Phi(2 z0 -+ z): where draws tend to lie below what
    they were drawn from, so does the value, below the truth.

    Missing: nan where more than 1 % of the draws are.
    Source:  Efron (1987), Better bootstrap confidence intervals, Journal of the American
             Statistical Association 82, 171-185, section 2.
    """
    known = np.maximum(np.sum(~np.isnan(values), axis=0), 1)
    below = (np.sum(values < observed, axis=0) + np.sum(values == observed, axis=0) / 2) / known
    # a value beyond every draw is as far out as one draw more could tell
    centre = ndtri(np.clip(below, 1 / (known + 1), known / (known + 1)))
    return quantiles(values, ndtr(2 * centre + _reach(level)))


def widest(values: Array, observed: Array, level: float) -> Array:
    """The wider on each side of plain and corrected limits; the value itself is always held.

    Shape, missing: as `corrected`; nan also where the value is.
    """
    plain = quantiles(values, ndtr(_reach(level)))
    other = corrected(values, observed, level)
    low, high = np.minimum(plain[0], other[0]), np.maximum(plain[1], other[1])
    return np.stack([np.minimum(low, observed), np.maximum(high, observed)])


def _reach(level: float) -> Array:
    """Normal quantiles of both tails, [2, 1]."""
    return float(ndtri((1 + level) / 2)) * np.array([[-1.0], [1.0]])


def quantiles(values: Array, shares: Array) -> Array:
    """Quantiles of draws [draw, row] at shares [share, row]: [share, row]; nan where too many draws
    are nan.

    A further draw falls between two neighbours of n with the chance 1 / (n + 1): so are the ranks
    counted, and the limits hold the level.
    """
    ordered = np.sort(values, axis=0)  # nan last
    known = np.sum(~np.isnan(values), axis=0)
    place = np.clip(shares * (known + 1) - 1, 0, np.maximum(known - 1, 0))
    below = np.floor(place).astype(int)
    above = np.minimum(below + 1, len(values) - 1)
    low, high = (np.take_along_axis(ordered, at, axis=0) for at in (below, above))
    limits = low + (place - below) * np.where(place == below, 0.0, high - low)
    return np.where(known >= (1 - FAILED) * len(values), limits, np.nan)
