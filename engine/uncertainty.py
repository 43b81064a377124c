"""Numbers with their intervals: by the delta method, or by simulation where they are not smooth.

An interval covers chance in deaths, which are Poisson; person-years are taken as known, or as known
up to an error that the settings name.
"""

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from engine.chain import Chain, run
from engine.chance import Chance, chances, limits, told
from engine.estimates import Estimate, Reason
from engine.indicator import Indicator, Limits
from engine.panel import Panel
from engine.reasons import against, unless_found
from engine.settings import Settings
from engine.simulation import Draw, drawn, flat, pair_redrawn, redrawn, simulated

Codes = NDArray[np.str_]

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

    Smooth, and counts over births: from what one death more at each age moves (delta method), as
    `engine.chance.limits` says. Not smooth: quantiles of the values of simulated tables, all read
    off the same draws.

    Where the settings name an error of the population, person-years are out at all ages together
    by the same number of standard deviations: the prudent choice, since errors of their own at each
    age would largely cancel. It moves a number as far as it moves with them, to which chance is
    added.

    Shape:   panel [..., age], streams [...] (the code of each population) -> [...].
    Missing: a value that may not be read is nan, with its reason. A value may stand without an
             interval: not simulated for want of streams; lacking in more than 1 % of the simulated
             tables. Without any deaths behind it a smooth number has limits, no standard error.
    Source:  Chiang (1984), The Life Table and Its Applications, chapter 8 (delta method);
             Brillinger (1986), Biometrics 42 (Poisson deaths); Andreev & Shkolnikov (2010), MPIDR
             Technical Report 2010-005 (simulation).
    """
    chain = run(panel, settings)
    found = _bare(indicators, chain)
    moved = chances(indicators, chain)
    for one in indicators:
        if told(one):
            bare, chance = found[one.key], moved[one.key]
            kind, rates = one.unit.limits, settings.rate_limits
            low, high = limits(kind, bare.value, chance, settings.level, rates=rates)
            found[one.key] = bare.within(low, high, chance.se, Reason.OFTEN_LOST)
    if streams is None:
        return found
    rows, names = flat(panel), np.asarray(streams).ravel()

    def draw(stepped: Sequence[Indicator], where: slice) -> dict[str, Array]:
        deaths = redrawn(rows[where], names[where], settings.draws, CHANCE)
        return drawn(stepped, rows[where], deaths, settings, names[where])

    return found | simulated(indicators, found, draw, settings)


def values(indicators: Sequence[Indicator], panel: Panel, settings: Settings) -> dict[str, Array]:
    """Each indicator of every population without an interval, by its key; the values of
    `estimates`, for what has no interval: one edition's figures beside another's.

    Shape:   panel [..., age] -> [...].
    Missing: nan where the value may not be read.
    """
    return {key: one.value for key, one in _bare(indicators, run(panel, settings)).items()}


def difference(
    indicator: Indicator,
    this: Panel,
    that: Panel,
    settings: Settings,
    *,
    shared: Panel | None = None,
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
    shared: Panel | None = None,
    streams: tuple[Codes, Codes] | None = None,
) -> dict[str, Estimate]:
    """Each indicator of this minus that, with the interval of the difference, by its key.

    Counts that stand in both (an area and the whole it belongs to, one sex and both), `shared`,
    move the two together: one death more moves the difference by g where it is of this alone, by -h
    where of that alone, by g - h where of both, g and h being what it moves either by. The limits
    follow as those of one number do. A simulation draws the shared deaths, those of this only and
    those of that only apart, from streams of their own.

    An error of the population is taken as each side's own, also in an area and its whole, or in two
    years of one area: what they have in common would cancel.

    Shape:   panels of one shape on one grid, streams of this and of that [...].
    Missing: as in `estimates`, the reason of this before that of that. Without an interval also
             where all deaths are counted in both and chance moves the two alike; without a standard
             error where either side has no deaths behind the number.
    Raises:  ValueError where the grids differ, or more deaths are shared than either has.
    Source:  as in `estimates`.
    """
    _require_comparable(this, that, shared)
    here, there = run(this, settings), run(that, settings)
    values, others = _bare(indicators, here), _bare(indicators, there)
    found = {key: _less(values[key], others[key]) for key in values}
    upper, lower = chances(indicators, here), chances(indicators, there)
    for one in indicators:
        if told(one):
            found[one.key] = _apart(
                found[one.key],
                one.unit.limits,
                upper[one.key],
                lower[one.key],
                _in_both(one, shared, settings),
                settings.level,
            )
    if streams is None:
        return found
    draw, alike = _pair_draw(this, that, shared, streams, settings), _alike(this, that, shared)
    return found | {
        key: stepped.within(
            np.where(alike, np.nan, stepped.low),
            stepped.high,
            stepped.se,
            np.where(alike, Reason.NO_SAMPLING_INTERVAL, stepped.reason),
        )
        for key, stepped in simulated(indicators, found, draw, settings).items()
    }


def _apart(
    bare: Estimate, kind: Limits, this: Chance, that: Chance, in_both: Array, level: float
) -> Estimate:
    """A difference with its limits: counts of this alone, of that alone and of both are apart."""
    own, other = this.variance, that.variance
    shared = np.broadcast_to(in_both, this.counts.shape)
    alone = [np.maximum(side.counts - shared, 0.0) for side in (this, that)]
    chance = Chance(
        np.concatenate([this.weights, -that.weights, this.weights - that.weights], axis=-1),
        np.concatenate([*alone, shared], axis=-1),
        np.hypot(this.astray, that.astray),
    )
    alike = (own + other > 0) & (chance.variance <= SAME * (own + other))
    low, high = limits(kind, bare.value, chance, level, apart=True)
    se = np.where((own > 0) & (other > 0), chance.se, np.nan)
    why = np.where(alike, Reason.NO_SAMPLING_INTERVAL, Reason.OFTEN_LOST)
    return bare.within(np.where(alike, np.nan, low), high, se, why)


def _in_both(one: Indicator, shared: Panel | None, settings: Settings) -> Array:
    """Counts behind a number that stand in both populations, as in its Chance."""
    if shared is None:
        return np.zeros(1)
    if one.unit.limits != "count":
        return shared.counts
    # births that one side did not hand in are taken as that side's own: no interval is too narrow
    return np.nan_to_num(chances([one], run(shared, settings))[one.key].counts)


def _require_comparable(this: Panel, that: Panel, shared: Panel | None) -> None:
    for other in (that, shared):
        if other is not None and this.grid != other.grid:
            raise ValueError(
                f"the age groups differ, {this.grid.code} and {other.grid.code}; regroup both to "
                "those they have in common"
            )
    if shared is not None:
        least = np.minimum(this.deaths, that.deaths)
        if np.any(shared.deaths > least * (1 + SAME)):
            raise ValueError("more deaths are shared than one side has; shared deaths are in both")


def _alike(this: Panel, that: Panel, shared: Panel | None) -> NDArray[np.bool_]:
    """Where both are the same people, and chance moves them alike."""
    if shared is None:
        return np.zeros(this.batch_shape, dtype=bool)
    same = (this.deaths == shared.deaths) & (that.deaths == shared.deaths)
    return np.asarray((same & (this.exposure == that.exposure)).all(axis=-1))


def _pair_draw(
    this: Panel,
    that: Panel,
    shared: Panel | None,
    streams: tuple[Codes, Codes],
    settings: Settings,
) -> Draw:
    """Differences of the values of simulated tables, deaths in both drawn once."""
    upper, lower = flat(this), flat(that)
    common = None if shared is None else flat(shared).counts
    here, there = (np.asarray(side).ravel() for side in streams)

    def draw(stepped: Sequence[Indicator], where: slice) -> dict[str, Array]:
        deaths = pair_redrawn(
            upper[where],
            lower[where],
            None if common is None else common[where],
            (here[where], there[where]),
            settings.draws,
            CHANCE,
        )
        values = drawn(stepped, upper[where], deaths.this, settings, here[where])
        others = drawn(stepped, lower[where], deaths.that, settings, there[where])
        return {key: values[key] - others[key] for key in values}

    return draw


def _bare(indicators: Sequence[Indicator], chain: Chain) -> dict[str, Estimate]:
    """The values where they may be read, without an interval."""
    reasons = {needs: against(needs, chain) for needs in {one.needs for one in indicators}}
    found = {}
    for one in indicators:
        with np.errstate(all="ignore"):
            value = one.value(chain)
        reason = unless_found(reasons[one.needs], one.needs, value)
        found[one.key] = Estimate.bare(value, reason, Reason.NOT_SIMULATED)
    return found


def _less(this: Estimate, that: Estimate) -> Estimate:
    reason = np.where(np.isfinite(this.value), that.reason, this.reason)
    return replace(this, value=this.value - that.value, reason=reason)
