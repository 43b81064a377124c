"""The people at the highest ages that a population's deaths imply."""

from dataclasses import dataclass

import numpy as np

from engine import indicators
from engine.estimates import Estimate
from engine.open_age import ImpliedPopulation, as_implied, implied_population
from engine.panel import Panel
from engine.settings import Settings

MOVED = ("e65", "H", "mode")  # what another population at the open age would move


@dataclass(frozen=True, slots=True)
class Implied:
    """The people at the open age that the deaths imply, and what figures they would give."""

    population: ImpliedPopulation
    figures: dict[str, Estimate]

    @property
    def known(self) -> bool:
        """Whether there is a ratio with limits: an area that is all of its whole has none."""
        return bool(np.isfinite(self.population.ratio.low))


def implied(panel: Panel, settings: Settings) -> Implied | None:
    """None where the area is part of no larger one."""
    if panel.whole is None:
        return None
    population = implied_population(panel, panel.whole, settings)
    ones = [indicators.find(key) for key in MOVED]
    return Implied(population, as_implied(ones, panel, population, settings))
