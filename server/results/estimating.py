"""Estimates of the usual indicators, with the random streams keyed by codes."""

from collections.abc import Iterable

import numpy as np
from numpy.typing import NDArray

from engine import indicators
from engine.estimates import Estimate
from engine.panel import Panel
from engine.settings import Settings
from server.results.questions import PopulationYear

# The few of a population-year and of a comparison that a reader meets first, in that order.
USUAL = ("e0", "e65", "median", "mode", "edagger", "H", "ageing_rate", "45q15", "5q0")
EVERY = tuple(dict.fromkeys((*USUAL, *indicators.INDICATORS)))
# Those set against an area's own whole, each weighted by its own people, compare with nothing else.
COMPARED = tuple(key for key in EVERY if not indicators.INDICATORS[key].needs.whole)


def stream(collection: str, one: PopulationYear) -> NDArray[np.str_]:
    """The code a population-year's draws are keyed by, no batch axes."""
    return np.array(f"{collection}/{one.code}", dtype=np.str_)


def estimates(
    keys: Iterable[str], panel: Panel, settings: Settings, codes: NDArray[np.str_]
) -> dict[str, Estimate]:
    """Each indicator of a panel; `codes` has the panel's batch shape."""
    return indicators.estimates(_found(keys), panel, settings, streams=codes)


def differences(
    keys: Iterable[str],
    this: Panel,
    that: Panel,
    settings: Settings,
    codes: tuple[NDArray[np.str_], NDArray[np.str_]],
    *,
    shared: Panel | None = None,
) -> dict[str, Estimate]:
    """This less that, both on one grid; those in both, `shared`, are counted once. `codes` are
    this one's and that one's."""
    return indicators.differences(_found(keys), this, that, settings, shared=shared, streams=codes)


def _found(keys: Iterable[str]) -> list[indicators.Indicator]:
    return [indicators.find(key) for key in keys]
