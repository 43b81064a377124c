"""Figures that rest on withheld counts: given to fixed decimals, or withheld with them.

Such a figure is worked out from what is shown and from stand-ins (server/disclosure), so it says
nothing of the counts withheld; to more decimals than are printed it would only feign exactness. A
chance or a rate of ages that are all withheld is withheld itself: what it would show is a stand-in.
"""

import re
from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from engine import indicators
from engine.ages import AgeGrid, Array
from engine.estimates import Estimate, Reason
from engine.indicators import Indicator, Unit
from server.results.loading import Loaded

_CHANCE = re.compile(r"(\d+)q(\d+)")
_INFANTS = ("imr", "pnmr")


def protected(key: str, estimate: Estimate, *sides: Loaded) -> Estimate:
    """One figure of these populations, no batch axes, as it may be given."""
    one = indicators.find(key)
    if any(withheld(one, side) for side in sides):
        gap, reason = np.array(np.nan), np.array(Reason.WITHHELD, np.uint8)
        return Estimate(gap, gap, gap, reason, gap)
    if any(side.protected for side in sides):
        return fixed(estimate, one.unit)
    return estimate


def all_protected(estimates: Mapping[str, Estimate], *sides: Loaded) -> dict[str, Estimate]:
    """Each as `protected`."""
    if not any(side.protected for side in sides):
        return dict(estimates)
    return {key: protected(key, one, *sides) for key, one in estimates.items()}


def protected_batch(
    estimate: Estimate, of: Indicator, sides: Sequence[Sequence[Loaded]]
) -> Estimate:
    """One figure of many, [one], each of the populations in its place of `sides`."""
    gone = np.array([any(withheld(of, side) for side in one) for one in sides], np.bool_)
    some = np.array([any(side.protected for side in one) for one in sides], np.bool_)
    if not (gone.any() or some.any()):
        return estimate
    to = fixed(estimate, of.unit)

    def chosen(name: str) -> Array:
        column = np.where(some, getattr(to, name), getattr(estimate, name))
        return np.asarray(np.where(gone, np.nan, column))

    reason = np.where(gone, np.uint8(Reason.WITHHELD), estimate.reason)
    return Estimate(chosen("value"), chosen("low"), chosen("high"), reason, chosen("se"))


def fixed(estimate: Estimate, unit: Unit) -> Estimate:
    """An estimate to the decimals it is printed with, of any shape."""

    def to(column: Array) -> Array:
        return np.asarray(np.round(unit.scale * column, unit.decimals) / unit.scale)

    return Estimate(
        to(estimate.value), to(estimate.low), to(estimate.high), estimate.reason, to(estimate.se)
    )


def withheld(of: Indicator, loaded: Loaded) -> bool:
    """Whether every death it counts is withheld."""
    if loaded.births_withheld & set(of.needs.births):
        return True
    ages = _ages(of)
    if ages is None or not loaded.withheld:
        return False
    grid = loaded.panel.grid
    inside = [ages[0] <= start < ages[1] for start in grid.starts]
    return any(inside) and bool(loaded.withheld_on(grid)[inside].all())


def withheld_in(grid: AgeGrid, *sides: Loaded) -> NDArray[np.bool_]:
    """Groups of a grid in which a side withholds deaths, [age]."""
    return np.asarray(np.any([side.withheld_on(grid) for side in sides], axis=0))


def _ages(of: Indicator) -> tuple[int, int] | None:
    """The ages whose deaths alone it counts, first and end; None: it rests on all or many."""
    if of.key in _INFANTS:
        return 0, 1
    found = _CHANCE.fullmatch(of.key)
    return (int(found[2]), int(found[2]) + int(found[1])) if found else None
