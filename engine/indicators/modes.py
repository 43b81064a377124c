"""The most common age at death of adults, read in three ways."""

import hashlib
from dataclasses import dataclass

import numpy as np

from engine.ages import Array
from engine.chain import Chain
from engine.estimates import Reason
from engine.indicator import Indicator, Needs, Unit
from engine.indicators.expectancy import YEARS
from engine.smoothing import Curve, fit, fit_each, posterior_curves
from engine.stages.smoothing import LEAST_GROUPS, adult_counts, adult_groups
from engine.streams import generator

STEP = 0.2  # years between the ages at which the curve is read; finds its peak to 0.004


@dataclass(frozen=True, slots=True)
class _Deaths:
    """Table deaths per year of age in the closed adult groups of the panel's grid."""

    starts: Array  # [group]
    widths: Array  # [group]
    density: Array  # [..., group]


def _deaths(chain: Chain) -> _Deaths:
    groups = adult_groups(chain.panel.grid)
    widths = chain.panel.grid.widths[groups]
    starts = np.array(chain.panel.grid.starts, float)[groups]
    return _Deaths(starts, widths, chain.table.dx[..., groups] / widths)


def _raw(chain: Chain) -> Array:
    deaths = _deaths(chain)
    if len(deaths.starts) < 3:
        return np.full(deaths.density.shape[:-1], np.nan)
    top = np.argmax(deaths.density, axis=-1)
    inner = (top < len(deaths.starts) - 1) & np.isfinite(deaths.density).all(axis=-1)
    return np.where(inner, deaths.starts[top], np.nan)


def _parabola(chain: Chain) -> Array:
    deaths = _deaths(chain)
    if len(deaths.starts) < 3:
        return np.full(deaths.density.shape[:-1], np.nan)
    top = np.argmax(deaths.density, axis=-1)
    inner = (top > 0) & (top < len(deaths.starts) - 1) & np.isfinite(deaths.density).all(axis=-1)
    top = np.where(inner, top, 1)
    below, at, above = (
        np.take_along_axis(deaths.density, (top + side)[..., None], axis=-1)[..., 0]
        for side in (-1, 0, 1)
    )
    width = deaths.widths[top]
    equal = (deaths.widths[top - 1] == width) & (deaths.widths[top + 1] == width)
    with np.errstate(all="ignore"):
        age = deaths.starts[top] + width * (at - below) / (2 * at - below - above)
    return np.where(inner & equal & np.isfinite(age), age, np.nan)


def _peak(curve: Curve) -> Array:
    """Where l(x) mu(x) is greatest; nan where that is at an end of the curve."""
    basis = curve.basis
    ages = np.linspace(basis.low, basis.high, round((basis.high - basis.low) / STEP) + 1)
    with np.errstate(all="ignore"):
        logs = curve.log_rates(ages)
        rates = np.exp(logs)
        spent = np.cumsum((rates[..., 1:] + rates[..., :-1]) / 2 * STEP, axis=-1)
        logs[..., 1:] -= spent  # log l(x) + log mu(x)
        top = np.argmax(logs, axis=-1)
        inner = (top > 0) & (top < len(ages) - 1)
        top = np.where(inner, top, 1)
        below, at, above = (
            np.take_along_axis(logs, (top + side)[..., None], axis=-1)[..., 0]
            for side in (-1, 0, 1)
        )
        age = ages[top] + STEP / 2 * (above - below) / (2 * at - below - above)
    return np.where(inner & np.isfinite(age), age, np.nan)


def _smooth(chain: Chain) -> Array:
    if _few(chain):
        return np.full(chain.panel.batch_shape, np.nan)
    return _peak(fit(*adult_counts(chain.panel.grid, chain.rates)))


def _smooth_redraw(observed: Chain, simulated: Chain) -> Array:
    """Peaks of curves as the counts leave them open, [draw, ...]."""
    if _few(observed):
        return np.full(simulated.panel.batch_shape, np.nan)
    tried = fit_each(*adult_counts(observed.panel.grid, observed.rates))
    deaths = adult_counts(simulated.panel.grid, simulated.rates).deaths
    return _peak(posterior_curves(tried, deaths, _noise(deaths, tried.basis.size - 1)))


def _noise(deaths: Array, many: int) -> Array:
    """Normal numbers [draw, ..., many], a stream for each population keyed by its simulated deaths
    [draw, ..., age], which come from a stream of its own: so is this one its own, too."""
    rows = np.ascontiguousarray(
        np.moveaxis(deaths.reshape(len(deaths), -1, deaths.shape[-1]), 1, 0)
    )
    noise = np.empty((len(deaths), len(rows), many))
    for row, counts in enumerate(rows):
        stream = generator("roughness", hashlib.sha256(counts.tobytes()).hexdigest())
        noise[:, row] = stream.standard_normal((len(deaths), many))
    return noise.reshape(*deaths.shape[:-1], many)


def _few(chain: Chain) -> bool:
    groups = adult_groups(chain.panel.grid)
    return bool(groups.stop - groups.start < LEAST_GROUPS)


NEEDS = Needs(open_small=True, otherwise=Reason.MODE_AT_EDGE)

FAMILY = (
    Indicator(
        key="mode",
        symbol="M",
        label="Most common age at death, adults",
        unit=YEARS,
        definition=(
            "The age above 10 at which most people would die if the death rates of the year held"
            " for all their lives, read off a smooth curve through the death rates of the closed"
            " age groups from 10. Each group stands at its middle, which in groups of five years"
            " moves the age by one or two tenths of a year. Its interval allows for chance and"
            " for not knowing how smooth the curve should be. In trials with 100,000 persons and"
            " more it held the true age in 92 to 99 of 100 cases from groups of five years, and in"
            " 76 to 99 from single years, where a slight bend of the rates is smoothed away."
        ),
        formula=(
            "the x with the greatest l(x) mu(x); log mu(x) a cubic B-spline with a knot every five"
            " years and a penalty on second differences, fitted with deaths Poisson given the"
            " person-years; weight of the penalty by the Bayesian information criterion"
        ),
        source=(
            "Eilers & Marx (1996), Statistical Science 11, 89-121 (the curve); Ouellette &"
            " Bourbeau (2011), Demographic Research 25, 595-628 (its use for the mode); Rue,"
            " Martino & Chopin (2009), Journal of the Royal Statistical Society B 71, 319-392 (the"
            " interval: curves drawn from what the counts leave open)"
        ),
        why_not_smooth=(
            "A small change of a death rate can move the highest point of a curve from one hump to"
            " another, and changes how strongly the curve is smoothed in steps."
        ),
        needs=NEEDS,
        value=_smooth,
        redraw=_smooth_redraw,
    ),
    Indicator(
        key="mode_raw",
        symbol="M raw",
        label="Most common age at death, adults: age group with most deaths",
        unit=Unit("years", "years", 1, 0),
        definition=(
            "The first age of the closed age group from 10 in which most people per year of age"
            " would die if the death rates of the year held for all their lives."
        ),
        formula="the x >= 10 with the greatest d(x) / n(x), the open group apart",
        source="Kannisto (2001), Mode and dispersion of the length of life, Population 13, 159-171",
        why_not_smooth="It jumps from one age group to another.",
        needs=NEEDS,
        value=_raw,
    ),
    Indicator(
        key="mode_parabola",
        symbol="M parabola",
        label="Most common age at death, adults: parabola",
        unit=YEARS,
        definition=(
            "The most common age at death above 10 from three age groups of one width: the one with"
            " most deaths in the life table and its two neighbours."
        ),
        formula=(
            "M = x + n (d(x) - d(x-n)) / ([d(x) - d(x-n)] + [d(x) - d(x+n)]), x to x+n the group"
            " with most deaths"
        ),
        source="Kannisto (2001), Mode and dispersion of the length of life, Population 13, 159-171",
        why_not_smooth="It jumps where another age group becomes the one with most deaths.",
        needs=NEEDS,
        value=_parabola,
    ),
)
