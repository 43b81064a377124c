"""What a difference is made of: ages, kinds of change, and the age composition of the people."""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine import decomposition, indicators, shift
from engine.ages import AgeGrid, Array
from engine.estimates import Estimate
from engine.indicators import Indicator
from engine.panel import Panel
from engine.settings import Settings
from server.results.cause_parts import CausePair, CauseParts, Years, cause_parts

DECOMPOSED = ("e0", "H")  # whatever else is asked for
Codes = NDArray[np.str_]


@dataclass(frozen=True, slots=True)
class Sides:
    """Two populations on one grid, and what both count."""

    this: Panel
    that: Panel
    shared: Panel | None
    codes: tuple[Codes, Codes]
    groups: AgeGrid  # those of pictures
    by_chance: bool = True  # False: the same people counted again
    causes: CausePair | None = None
    thresholds: tuple[Estimate, Estimate] | None = None  # ages up to which fewer deaths even lives


@dataclass(frozen=True, slots=True)
class Contribution:
    """What each age adds to a difference; the remainder belongs to no age."""

    by_age: Array  # [age]
    by_group: Array  # [group], the same summed, with the limits of the sums
    low: Array
    high: Array
    remainder: float
    difference: float
    order_share: float  # how far the order of replacing decides it; nan along the straight line


@dataclass(frozen=True, slots=True)
class Two:
    """A difference in two parts that add up to it."""

    first: float
    second: float


@dataclass(frozen=True, slots=True)
class Halves:
    """A difference shared between early deaths, below an age, and late ones, with limits."""

    values: Array  # [early, late]
    low: Array
    high: Array


@dataclass(frozen=True, slots=True)
class LongerEven:
    """Whether lives were longer, and of more even length, by deaths before and after the age up to
    which fewer deaths make length of life more even."""

    age: int  # the start of an age group, nearest to the mean of both sides' threshold
    thresholds: tuple[float, float]
    longer: Halves  # life expectancy
    even: Halves  # H


@dataclass(frozen=True, slots=True)
class Explained:
    """All that is known of what a difference is made of."""

    contributions: dict[str, Contribution]  # by indicator; missing where it has none
    path: Array | None  # [age], of the indicator asked for, through all years between
    unevenness: Two | None  # of H: through years lost per death, through life expectancy
    crude: Two | None  # of the crude rate: owed to the ages of the people, to their death rates
    kinds: shift.ShiftSqueeze
    longer_even: LongerEven | None
    causes: CauseParts | None  # of the indicator asked for, or of e0 where that has none


def explain(
    asked: str, finite: set[str], sides: Sides, between: Years | None, settings: Settings
) -> Explained:
    """`finite` are the keys whose difference has a value; `between` are all years from that to
    this, where there are some between and all are held."""
    keys = dict.fromkeys((*DECOMPOSED, asked))
    parts = {
        key: _contribution(indicators.find(key), sides, settings) for key in keys if key in finite
    }
    found = indicators.find(asked)
    return Explained(
        contributions={key: part for key, part in parts.items() if part is not None},
        path=_path(found, between, settings) if asked in finite else None,
        unevenness=_unevenness(sides, settings) if "H" in finite else None,
        crude=_crude(sides) if "cdr" in finite else None,
        kinds=shift.shift_squeeze(sides.this, sides.that, settings, shared=sides.shared),
        longer_even=_longer_even(sides, parts, settings),
        causes=_causes(found, finite, sides, between, settings),
    )


def decomposable(indicator: Indicator) -> bool:
    """Whether its difference is shared out over ages at all."""
    return indicator.unit.limits != "count" and indicator.key not in decomposition.NOT_DECOMPOSED


def _contribution(indicator: Indicator, sides: Sides, settings: Settings) -> Contribution | None:
    if not decomposable(indicator):
        return None
    both = (sides.this, sides.that)
    parts: decomposition.Contributions | decomposition.Stepwise
    if indicator.smooth:
        parts = decomposition.contributions(indicator, *both, settings)
        order = np.nan
    else:
        parts = decomposition.stepwise(indicator, *both, settings)
        order = float(parts.order_share)
    by_group = sides.this.grid.regroup(parts.by_age, sides.groups)
    low, high = _limits(indicator, sides, sides.groups, settings)
    return Contribution(
        parts.by_age,
        by_group,
        low,
        high,
        float(parts.remainder),
        float(parts.difference),
        order,
    )


def _limits(
    indicator: Indicator, sides: Sides, groups: AgeGrid, settings: Settings
) -> tuple[Array, Array]:
    """Of the sums over groups; nan where chance has no part."""
    if not sides.by_chance:
        gone = np.full(len(groups), np.nan)
        return gone, gone
    return decomposition.contribution_limits(
        indicator,
        sides.this,
        sides.that,
        settings,
        streams=sides.codes,
        shared=None if sides.shared is None else sides.shared.counts,
        groups=groups,
    )


def _longer_even(
    sides: Sides, parts: Mapping[str, Contribution | None], settings: Settings
) -> LongerEven | None:
    """None where a side's threshold is not known, or the ages have no group that begins there."""
    known = [parts.get(key) for key in DECOMPOSED]
    if sides.thresholds is None or any(one is None for one in known):
        return None
    here, there = (float(one.value) for one in sides.thresholds)
    middle = (here + there) / 2
    if not np.isfinite(middle):
        return None
    age = min(sides.groups.starts[1:], key=lambda start: abs(start - middle))
    halves = AgeGrid((0, age))
    longer, even = (
        Halves(
            sides.this.grid.regroup(part.by_age, halves),
            *_limits(indicators.find(key), sides, halves, settings),
        )
        for key, part in zip(DECOMPOSED, known, strict=True)
        if part is not None
    )
    return LongerEven(age, (here, there), longer, even)


def _causes(
    asked: Indicator, finite: set[str], sides: Sides, between: Years | None, settings: Settings
) -> CauseParts | None:
    one = asked if asked.smooth and decomposable(asked) else indicators.find("e0")
    if sides.causes is None or one.key not in finite:
        return None
    return cause_parts(
        one,
        sides.this,
        sides.that,
        sides.causes,
        sides.groups,
        between if one is asked else None,
        settings,
        by_chance=sides.by_chance,
    )


def _path(indicator: Indicator, between: Years | None, settings: Settings) -> Array | None:
    if between is None or not (indicator.smooth and decomposable(indicator)):
        return None
    by_age = decomposition.along(indicator, between.panel, settings).by_age
    return by_age if np.isfinite(by_age).all() else None


def _unevenness(sides: Sides, settings: Settings) -> Two:
    lost, lived = (indicators.find(key) for key in ("edagger", "e0"))
    parts = decomposition.unevenness_parts(lost, lived, sides.this, sides.that, settings)
    return Two(
        float(parts.lost.sum() + parts.lost_remainder),
        float(parts.lived.sum() + parts.lived_remainder),
    )


def _crude(sides: Sides) -> Two:
    parts = decomposition.of_crude_rates(sides.this, sides.that)
    return Two(float(parts.composition.sum()), float(parts.rate.sum()))
