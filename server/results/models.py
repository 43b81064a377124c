"""Laws fitted to one population, and the people at the highest ages that its deaths imply."""

from dataclasses import dataclass

import numpy as np
from scipy.special import ndtri

from engine import indicators, laws
from engine.estimates import Estimate
from engine.open_age import ImpliedPopulation, as_implied, implied_population
from engine.panel import Panel
from engine.settings import Settings
from engine.survival import adult_mode

ADULT = 40  # laws of one rising term are fitted from here
FROM = {"gompertz": ADULT, "kannisto": ADULT, "makeham": ADULT, "makeham_infant": 0, "siler": 0}
MOVED = ("e65", "H", "mode")  # what another population at the open age would move


@dataclass(frozen=True, slots=True)
class Fitted:
    """A law fitted to the closed age groups from an age on."""

    law: laws.Law
    first: int
    fit: laws.Fit
    mode: tuple[float, float, float]  # age about which deaths gather, and its limits
    slope: tuple[float, float, float]  # rise of death rates with age, and its limits

    @property
    def found(self) -> bool:
        return bool(self.fit.converged)

    @property
    def free(self) -> int:
        """Age groups less the parameters that were free."""
        return int(self.fit.deaths.shape[-1] - np.sum(~self.fit.at_bound))


@dataclass(frozen=True, slots=True)
class Implied:
    """The people at the open age that the deaths imply, and what figures they would give."""

    population: ImpliedPopulation
    figures: dict[str, Estimate]

    @property
    def known(self) -> bool:
        """Whether there is a ratio with limits: an area that is all of its whole has none."""
        return bool(np.isfinite(self.population.ratio.low))


def fitted(panel: Panel, level: float) -> tuple[Fitted, ...]:
    """Every law, over the closed groups from its first age; those with enough groups."""
    return tuple(
        _fitted(laws.LAWS[key], panel, first, level)
        for key, first in FROM.items()
        if sum(start >= first for start in panel.grid.starts[:-1]) > len(laws.LAWS[key].names)
    )


def _fitted(law: laws.Law, panel: Panel, first: int, level: float) -> Fitted:
    grid = panel.grid
    inside = slice(int(np.searchsorted(grid.starts, first)), len(grid) - 1)
    found = laws.fit(
        law,
        grid.mids[inside],
        panel.deaths[inside],
        panel.exposure[inside],
        widths=grid.widths[inside],
    )
    mode, slope_se = adult_mode(found), float(found.se[law.position("slope")])
    return Fitted(
        law,
        grid.starts[inside.start],
        found,
        _limits(float(mode.age), float(mode.se), level),
        _limits(float(found.slope), slope_se, level),
    )


def _limits(value: float, se: float, level: float) -> tuple[float, float, float]:
    half = float(ndtri((1 + level) / 2)) * se
    return value, value - half, value + half


def implied(panel: Panel, settings: Settings) -> Implied | None:
    """None where the area is part of no larger one."""
    if panel.whole is None:
        return None
    population = implied_population(panel, panel.whole, settings)
    ones = [indicators.find(key) for key in MOVED]
    return Implied(population, as_implied(ones, panel, population, settings))
