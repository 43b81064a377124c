"""Figures that international targets are stated in, as far as a cause list tells them apart."""

from collections.abc import Sequence
from dataclasses import dataclass, field

from engine.causes.counts import CauseCounts
from engine.causes.targets import chance_30_to_70, crude_rate
from engine.estimates import Estimate
from engine.indicator import Unit
from engine.indicators.rates import PER_100000
from engine.panel import Panel
from engine.settings import Settings
from server.intake.causes.codes import ICD_10, Range
from server.store.records import Cause

CHANCE = Unit("per_100_aged_30", "per 100 aged 30", 100, 1, limits="part")
GOALS = "United Nations, metadata of indicator {number} of the Sustainable Development Goals"


@dataclass(frozen=True, slots=True)
class Target:
    """A published figure: its number, what is counted, in which unit."""

    key: str
    number: str
    label: str
    unit: Unit
    codes: str  # of ICD-10
    source: str
    care: str = ""


# A place for every target whose codes are known for certain; others are left out.
TARGETS = (
    Target(
        "ncd",
        "3.4.1",
        "Chance of dying between 30 and 70 of heart and circulation, cancer, diabetes or chronic"
        " lung disease, other causes absent",
        CHANCE,
        "I00-I99 C00-C97 E10-E14 J30-J98",
        f"World Health Organization; {GOALS.format(number='3.4.1')}",
    ),
    Target(
        "suicide",
        "3.4.2",
        "Suicide, crude death rate",
        PER_100000,
        "X60-X84 Y87.0",
        f"World Health Organization; {GOALS.format(number='3.4.2')}",
        "suicide",
    ),
    Target(
        "road",
        "3.6.1",
        "Road traffic, crude death rate",
        PER_100000,
        "V01-V04 V06 V09-V80 V87 V89 V99",
        f"World Health Organization; {GOALS.format(number='3.6.1')}",
    ),
    Target(
        "homicide",
        "16.1.1",
        "Violence, crude death rate",
        PER_100000,
        "X85-Y09 Y87.1",
        f"United Nations Office on Drugs and Crime; {GOALS.format(number='16.1.1')}",
        "violence",
    ),
)


@dataclass(frozen=True, slots=True)
class Reached:
    """A target's figure, or the causes of the list that hold others of its deaths besides."""

    target: Target
    estimate: Estimate | None  # no batch axes
    causes: tuple[Cause, ...] = ()  # those counted
    mixed: tuple[Cause, ...] = field(default=())  # those that hold some of its codes and others


def reached(
    panel: Panel, counts: CauseCounts, listed: Sequence[Cause], settings: Settings
) -> tuple[Reached, ...]:
    """Every target. `listed` are the causes without parts, in the order of the cause axis."""
    return tuple(_reached(one, panel, counts, listed, settings) for one in TARGETS)


def _reached(
    target: Target,
    panel: Panel,
    counts: CauseCounts,
    listed: Sequence[Cause],
    settings: Settings,
) -> Reached:
    inside, mixed = matched(listed, target.codes)
    if mixed or not inside:
        return Reached(target, None, tuple(listed[at] for at in inside), mixed)
    own = counts.over(lambda array: array[..., list(inside), :])
    figure = chance_30_to_70 if target.unit is CHANCE else crude_rate
    return Reached(target, figure(panel, own, settings), tuple(listed[at] for at in inside))


def matched(listed: Sequence[Cause], codes: str) -> tuple[tuple[int, ...], tuple[Cause, ...]]:
    """The places of those causes all of whose codes are among these, and the causes of which only
    some are. Of two ranges that hold a code the one that names more digits has it."""
    asked = _ranges(codes.split())
    inside = [
        at
        for at, cause in enumerate(listed)
        if (own := _ranges(cause.ranges))
        and all(any(one.covers(part) for one in asked) for part in own)
    ]
    taken = [part for at in inside for part in _ranges(listed[at].ranges)]

    def mixes(part: Range) -> bool:
        met = [one for one in asked if one.meets(part)]
        return any(
            not any(own.covers(one) and own.fine > part.fine for own in taken) for one in met
        )

    mixed = [
        cause
        for at, cause in enumerate(listed)
        if at not in inside and any(mixes(part) for part in _ranges(cause.ranges))
    ]
    return tuple(inside), tuple(mixed)


def _ranges(texts: Sequence[str]) -> tuple[Range, ...]:
    return ICD_10.ranges(",".join(texts)) or () if texts else ()
