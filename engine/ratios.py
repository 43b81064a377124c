"""By how many times the death rates of one population are those of another, age by age."""

from dataclasses import dataclass

import numpy as np
from scipy.special import betaincinv, ndtri

from engine.ages import Array
from engine.chance import miscount
from engine.panel import Panel
from engine.settings import Settings


@dataclass(frozen=True, slots=True)
class Ratios:
    """This over that, with the limits that chance in the deaths leaves; each [..., age]."""

    value: Array
    low: Array
    high: Array


def rate_ratios(
    this: Panel, that: Panel, settings: Settings, *, shared: Panel | None = None
) -> Ratios:
    """Ratio of the death rates as counted, m_x of this over m_x of that.

    Where the two have no deaths in common those of this are binomial given the deaths of both
    together, so that the exact limits of that share (Clopper & Pearson) give exact limits of the
    ratio. Where deaths stand in both (`shared`, S) the logarithm of the ratio has the variance
    1 / D + 1 / D' - 2 S / (D D'), and the limits follow from its square root. Of deaths that were
    shared out chance is in those counted. An error of the population that the settings name is each
    side's own, and widens the distance of the limits on the logarithmic scale.

    Shape:   panels [..., age] of one grid -> [..., age].
    Missing: nan where a side has no person-years, or where nobody died on either side. Where nobody
             died in this the ratio is 0, and only its upper limit is above it; where nobody died in
             that it has no value and no upper limit (nan).
    Raises:  ValueError where the grids differ.
    Source:  Przyborowski & Wilenski (1940), Biometrika 31 (the ratio of two Poisson means); Clopper
             & Pearson (1934), Biometrika 26; Rothman, Greenland & Lash (2008), Modern Epidemiology,
             chapter 14 (the logarithm of a ratio of rates).
    """
    if this.grid != that.grid:
        raise ValueError(
            f"the age groups differ, {this.grid.code} and {that.grid.code}; regroup both to those "
            "they have in common"
        )
    tail = (1 - settings.level) / 2
    with np.errstate(all="ignore"):
        per_count = _rate_of_one(this) / _rate_of_one(that)
        ours, theirs = this.counts, that.counts
        value = np.where(theirs > 0, ours / theirs, np.nan) * per_count
        if shared is None:
            low, high = _exact(ours, theirs, tail)
        else:
            low, high = _common(ours, theirs, shared.counts, tail)
        low, high = low * per_count, high * per_count
        low, high = _astray(value, low, high, this, settings)
    known = np.isfinite(per_count) & (ours + theirs > 0)
    return Ratios(*(np.where(known, part, np.nan) for part in (value, low, high)))


def _rate_of_one(panel: Panel) -> Array:
    """The rate that one counted death makes."""
    worth = panel.worth
    return (1.0 if worth is None else worth) / np.where(panel.exposure > 0, panel.exposure, np.nan)


def _exact(ours: Array, theirs: Array, tail: float) -> tuple[Array, Array]:
    """Limits of the ratio of two Poisson means from their counts."""
    low = np.where(ours > 0, betaincinv(np.maximum(ours, 1e-300), theirs + 1, tail), 0.0)
    high = np.where(theirs > 0, betaincinv(ours + 1, np.maximum(theirs, 1e-300), 1 - tail), np.nan)
    return low / (1 - low), high / (1 - high)


def _common(ours: Array, theirs: Array, both: Array, tail: float) -> tuple[Array, Array]:
    some = (ours > 0) & (theirs > 0)
    variance = 1 / ours + 1 / theirs - 2 * both / (ours * theirs)
    far = np.where(some, ndtri(1 - tail) * np.sqrt(np.maximum(variance, 0.0)), np.nan)
    ratio = ours / theirs
    return ratio * np.exp(-far), ratio * np.exp(far)


def _astray(
    value: Array, low: Array, high: Array, panel: Panel, settings: Settings
) -> tuple[Array, Array]:
    """Limits as far out as persons counted wrongly on both sides may move them besides."""
    error = miscount(panel.grid, settings)
    if not error.any():
        return low, high
    out = np.sqrt(2) * error * ndtri((1 + settings.level) / 2)
    below, above = np.log(value / low), np.log(high / value)
    return value * np.exp(-np.hypot(below, out)), value * np.exp(np.hypot(above, out))
