"""Shift, squeeze and early deaths: a difference in life expectancy told by a fitted law."""

from dataclasses import dataclass

import numpy as np
from numpy.polynomial.legendre import leggauss
from numpy.typing import NDArray
from scipy.special import ndtri

from engine.ages import Array
from engine.chain import Chain, run
from engine.chance import astray, per_count
from engine.estimates import Estimate, Reason
from engine.hazards import MAKEHAM_INFANT, Law
from engine.indicator import Needs
from engine.indicators import difference, find
from engine.laws import Fit, fit
from engine.panel import Panel
from engine.reasons import judge
from engine.settings import Settings
from engine.survival import lives, mode_of
from engine.tables import Partials

PARTS = ("shift", "squeeze", "background", "infant")
VALUES = (*PARTS, "unexplained")
OWNER = {"level": 0, "slope": 1, "background": 2, "infant": 3, "decline": 3}  # place in PARTS
NODES = 12  # of Gauss and Legendre along the line
FEW = 4  # as many for the standard errors: right to a few parts in a million
STEP = 1e-30  # of the complex step
WORST = 1.0  # years by which a law's expectancy may miss the table's on either side


@dataclass(frozen=True, slots=True)
class ShiftSqueeze:
    """A difference in e0, this minus that, in years: four parts and a rest that add up to it."""

    shift: Estimate  # the adult mode: all of old age moved to other ages
    squeeze: Estimate  # the slope: old-age deaths drawn closer about the mode
    background: Estimate  # the death rate that is the same at all ages
    infant: Estimate  # early deaths
    unexplained: Estimate  # what the two laws miss: the tables' difference less the laws'
    difference: Estimate  # of the life tables, as it is given everywhere
    laws: tuple[Fit, Fit]  # of this and that
    misfits: tuple[Array, Array]  # [...], years by which a law's e0 is above its table's


def shift_squeeze(
    this: Panel,
    that: Panel,
    settings: Settings,
    *,
    law: Law = MAKEHAM_INFANT,
    shared: Panel | None = None,
) -> ShiftSqueeze:
    """The difference in life expectancy at birth by the parameters of a law fitted to each side.

    The law is fitted to the closed age groups of each. Its rising term is slope *
    exp(slope (x - mode)); along the straight line between the two sets of mode, slope, background
    and infant rate, a parameter's part is the integral of d e0 / d parameter over its change
    (twelve Gauss-Legendre nodes), so that the parts add up to the laws' difference. What the tables
    differ by beyond that is the rest, printed and spread over nothing. The chances in the deaths
    reach each part through the fit, and the rest through fit and table; deaths that stand in both
    (`shared`) count once. An error of the population that the settings name is each side's own. The
    difference itself has the limits that it has everywhere (`engine.uncertainty.difference`).

    The default law has the infants' deaths as an excess in the first year. Siler's, in which they
    decline with age, is the alternative: where few die between 1 and 4 its decline has no best
    value, as for 10 of 39 years of Danish men, and then there is none.

    A rate held at 0 on one side counts as known there: in areas of 50,000 the limits of the
    background's part then held it in 90 % of samples in place of 95, elsewhere in 93 % or more.

    Shape:   panels of one shape and grid -> [...].
    Missing: the difference as in `engine.uncertainty.differences`; parts and rest also where either
             side has no law (`Reason.NO_LAW`), or one whose e0 is more than one year off the
             table's; by how much it is off stands in `misfits` all the same.
    Raises:  ValueError where the grids differ, or the law lacks a term.
    Source:  Bergeron-Boucher, Ebeling & Canudas-Romo (2015), Demographic Research 33, 391-424
             (compression and shift); Horiuchi, Wilmoth & Pletcher (2008), Demography 45 (line
             integral); Missov, Lenart, Nemeth, Canudas-Romo & Vaupel (2015), Demographic Research
             32 (the law by its mode).
    """
    _require(this, that, shared, law)
    chains = run(this, settings), run(that, settings)
    sides = _fitted(this, law), _fitted(that, law)
    misfits = _misfit(chains[0], sides[0]), _misfit(chains[1], sides[1])

    def anew(upper: Panel, lower: Panel) -> Array:
        fits = _fitted(upper, law), _fitted(lower, law)
        return _values((run(upper, settings), run(lower, settings)), fits)

    with np.errstate(all="ignore"):
        values = _values(chains, sides)
        moved = _moved(chains[0], sides, 0), _moved(chains[1], sides, 1)
        by_chance = np.sqrt(_variance(moved, this, that, shared))
        out = astray(anew, this, that, settings=settings)
        se = np.where(by_chance > 0, np.hypot(by_chance, out), 0.0)
    reason = _reasons(*chains, misfits)
    named = {
        name: _estimate(value, reason, error, settings.level)
        for name, value, error in zip(VALUES, values, se, strict=True)
    }
    whole = difference(find("e0"), this, that, settings, shared=shared)
    return ShiftSqueeze(**named, difference=whole, laws=sides, misfits=misfits)


def _values(chains: tuple[Chain, Chain], sides: tuple[Fit, Fit]) -> Array:
    """The parts and the rest, [value, ...]."""
    this, that = sides
    parts = _parts(this.law, this.parameters, that.parameters, this.centre)
    table = chains[0].table.ex[..., 0] - chains[1].table.ex[..., 0]
    return np.concatenate([parts, (table - parts.sum(axis=0))[None]])


def _fitted(panel: Panel, law: Law) -> Fit:
    grid, closed = panel.grid, slice(0, len(panel.grid) - 1)
    return fit(
        law,
        grid.mids[closed],
        panel.deaths[..., closed],
        panel.exposure[..., closed],
        widths=grid.widths[closed],
    )


def _parts(law: Law, this: Array, that: Array, centre: float, nodes: int = NODES) -> Array:
    """Of the laws' difference in e0, from both sets of parameters: [part, ...]."""
    start, end = _plain(law, that, centre), _plain(law, this, centre)
    change = end - start
    node, weights = (part.reshape(-1, *(1,) * change.ndim) for part in leggauss(nodes))
    at = start + (1 + node) / 2 * change
    slopes = lives(law, _logs(law, at, centre), centre).slopes
    place = {name: law.position(name) for name in law.names}
    level, slope = place["level"], place["slope"]
    by_level, b = slopes[..., level], at[..., slope]
    by_plain = slopes / at  # by a rate, from that by its logarithm
    by_plain[..., level] = -b * by_level
    by_plain[..., slope] = slopes[..., slope] + by_level * (1 / b - (at[..., level] - centre))
    if "decline" in place:
        by_plain[..., place["decline"]] = slopes[..., place["decline"]]
    # a background of 0 on both sides has no part, and no derivative by its logarithm
    moved = np.where(change == 0, 0.0, (weights / 2 * by_plain).sum(axis=0) * change)
    parts = np.zeros((len(PARTS), *moved.shape[:-1]), moved.dtype)
    for name, j in place.items():
        parts[OWNER[name]] += moved[..., j]
    return parts


def _plain(law: Law, parameters: Array, centre: float) -> Array:
    """Mode, slope, and the other rates themselves, in the order of the law's parameters."""
    plain = np.exp(parameters)
    level, slope = law.position("level"), law.position("slope")
    plain[..., level] = mode_of(parameters[..., level], parameters[..., slope], centre)
    for name in ("slope", "decline"):
        if name in law.names:
            plain[..., law.position(name)] = parameters[..., law.position(name)]
    return plain


def _logs(law: Law, plain: Array, centre: float) -> Array:
    """The law's parameters back from these."""
    logs = np.log(plain)
    level, slope = law.position("level"), law.position("slope")
    logs[..., level] = np.log(plain[..., slope]) - plain[..., slope] * (plain[..., level] - centre)
    for name in ("slope", "decline"):
        if name in law.names:
            logs[..., law.position(name)] = plain[..., law.position(name)]
    return logs


def _moved(chain: Chain, sides: tuple[Fit, Fit], which: int) -> Array:
    """What one death more on one side moves each value by: [value, ..., age]."""
    by_death = sides[which].per_death(_by_parameters(sides, which))
    parts = np.concatenate([by_death, np.zeros_like(by_death[..., :1])], axis=-1)
    at_birth = (np.arange(len(chain.table.grid)) == 0).astype(float)
    table = chain.rates.per_death(chain.pull(Partials(ex=at_birth)))
    table = table if which == 0 else -table
    return np.concatenate([parts, (table - parts.sum(axis=0))[None]])


def _by_parameters(sides: tuple[Fit, Fit], which: int) -> Array:
    """d part / d parameter of one side, by complex step: [part, ..., parameter]."""
    law, centre = sides[0].law, sides[0].centre
    at = [side.parameters for side in sides]
    slopes = []
    for unit in np.eye(len(law.names)):
        beside = [*at]
        beside[which] = at[which] + 1j * STEP * unit
        slopes.append(_parts(law, beside[0], beside[1], centre, FEW).imag / STEP)
    return np.where(sides[which].at_bound, 0.0, np.stack(slopes, axis=-1))


def _variance(moved: tuple[Array, Array], this: Panel, that: Panel, shared: Panel | None) -> Array:
    """Of each value: deaths counted are Poisson, those in both count once. [value, ...]"""
    moved = per_count(this, moved[0]), per_count(that, moved[1])
    own, other = (
        (weights**2 * panel.counts).sum(axis=-1)
        for weights, panel in zip(moved, (this, that), strict=True)
    )
    if shared is None:
        return np.asarray(own + other)
    both = (moved[0] * moved[1] * shared.counts).sum(axis=-1)
    return np.asarray(np.maximum(own + other + 2 * both, 0.0))


def _misfit(chain: Chain, side: Fit) -> Array:
    expectancy = lives(side.law, side.parameters, side.centre).expectancy
    return np.asarray(expectancy - chain.table.ex[..., 0])


def _reasons(here: Chain, there: Chain, misfits: tuple[Array, Array]) -> NDArray[np.uint8]:
    """Of the parts and the rest, [...]."""
    needs = Needs(open_deaths=True)
    this, that = (judge(needs, chain, chain.table.ex[..., 0]) for chain in (here, there))
    reason = np.where(this == Reason.NONE, that, this)
    with np.errstate(invalid="ignore"):
        fits = (np.abs(misfits[0]) <= WORST) & (np.abs(misfits[1]) <= WORST)
    return np.where((reason == Reason.NONE) & ~fits, np.uint8(Reason.NO_LAW), reason)


def _estimate(value: Array, reason: NDArray[np.uint8], se: Array, level: float) -> Estimate:
    half = float(ndtri((1 + level) / 2)) * np.where(se > 0, se, np.nan)
    bare = Estimate.bare(value, reason, Reason.NO_SAMPLING_INTERVAL)
    return bare.within(value - half, value + half, se, Reason.NO_SAMPLING_INTERVAL)


def _require(this: Panel, that: Panel, shared: Panel | None, law: Law) -> None:
    for other in (that, shared):
        if other is not None and other.grid != this.grid:
            raise ValueError(
                f"the age groups differ, {this.grid.code} and {other.grid.code}; regroup both to "
                "those they have in common"
            )
    for name in ("level", "slope", "background", "infant"):
        law.position(name)
