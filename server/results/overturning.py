"""How far the counts of a side would have to be wrong to overturn what is said of a difference."""

import math
from dataclasses import dataclass, replace

import numpy as np

from engine import indicators
from engine.indicators import Indicator
from engine.panel import Panel
from engine.settings import Settings
from server.results.compared import Comparison, Side

TRIED = 0.01  # one per cent more deaths, from which the rest is reckoned
STEPS = 3  # each from the slope to the last one


@dataclass(frozen=True, slots=True)
class Overturned:
    """With so many per cent more deaths (fewer, below 0) on one side, at all ages alike, a limit of
    the difference reaches 0: what was clear is so no longer, or what was not becomes clear. Person-
    years that are out by as much the other way do the same."""

    side: Side
    deaths: float


def overturned(found: Comparison) -> Overturned | None:
    """The smallest such error of either side; of the provisional one where one alone is. None where
    the difference has no interval, or where no error of deaths moves it.

    The limits are taken to move with the value.
    """
    one, difference = indicators.find(found.question.of), found.difference[found.question.of]
    low, high = float(difference.low), float(difference.high)
    if found.same or not (math.isfinite(low) and math.isfinite(high)):
        return None
    clear = low > 0 or high < 0
    moves = [-low if low > 0 else -high] if clear else [-low, -high]
    counted = [side for side in (found.this, found.that) if not side.place.standard]
    late = [side for side in counted if side.loaded.status == "provisional"]
    known = [
        Overturned(side, percent)
        for side in (late if len(late) == 1 else counted)
        for move in moves
        for percent in [_needed(one, side.panel, move * _sign(found, side), found.settings)]
        if math.isfinite(percent)
    ]
    return min(known, key=lambda one: abs(one.deaths), default=None)


def _sign(found: Comparison, side: Side) -> float:
    return 1.0 if side is found.this else -1.0


def _needed(one: Indicator, panel: Panel, move: float, settings: Settings) -> float:
    """Per cent more deaths that move the number so far: from the slope of one per cent, corrected
    by what that much really moves it; nan where it does not move, or all deaths would not do."""
    here = _value(one, panel, 0.0, settings)
    share = TRIED
    for _step in range(STEPS):
        moved = _value(one, panel, share, settings) - here
        if not (math.isfinite(moved) and moved):
            return math.nan
        share = move / moved * share
        if not -0.9 < share < 10.0:
            return math.nan
    return 100 * share


def _value(one: Indicator, panel: Panel, share: float, settings: Settings) -> float:
    more = replace(panel, deaths=panel.deaths * (1 + share), counted=None)
    return float(np.asarray(indicators.values([one], more, settings)[one.key]))
