"""Laws fitted to one population: which describes its death rates best, and how well."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from scipy.special import chdtri, ndtri

from engine import laws
from engine.panel import Panel
from engine.survival import adult_mode

ADULT = 40  # laws of one rising term are fitted from here
FROM = {"gompertz": ADULT, "kannisto": ADULT, "makeham": ADULT, "makeham_infant": 0, "siler": 0}
NEAR = 2.0  # laws whose AIC differs by less are hardly told apart
FEW = 5.0  # deaths expected in a group, below which the measure of misfit is rough
OFTEN = 0.2  # the share of groups with so few that it may have


class Limited(NamedTuple):
    """A number and the limits of its interval."""

    value: float
    low: float
    high: float


def limited(value: float, se: float, level: float) -> Limited:
    """Even limits, by the normal distribution."""
    half = float(ndtri((1 + level) / 2)) * se
    return Limited(value, value - half, value + half)


@dataclass(frozen=True, slots=True)
class Fitted:
    """A law fitted to the closed age groups from an age on."""

    law: laws.Law
    first: int
    fit: laws.Fit
    mode: Limited  # age about which deaths gather
    slope: Limited  # rise of death rates with age
    level: float

    @property
    def found(self) -> bool:
        return bool(self.fit.converged)

    @property
    def free(self) -> int:
        """Age groups less the parameters that were free."""
        return int(self.fit.deaths.shape[-1] - np.sum(~self.fit.at_bound))

    @property
    def bounded(self) -> bool:
        """Whether a term was held at 0, so that the law is a simpler one."""
        return bool(np.any(self.fit.at_bound))

    @property
    def bound(self) -> float:
        """The deviance that chance alone stays below with the probability of the level.

        Source: McCullagh & Nelder (1989), Generalized Linear Models, chapter 2 (chi-square).
        """
        return float(chdtri(self.free, 1 - self.level))

    @property
    def misses(self) -> bool:
        """Whether the law is farther from the counts than chance would bring it."""
        return float(self.fit.deviance) > self.bound

    @property
    def rough(self) -> bool:
        """Whether so many groups have few deaths that the deviance hardly follows chi-square.

        Source: Cochran (1954), Biometrics 10, 417-451.
        """
        expected = self.fit.exposure * self.fit.rates
        return float(np.mean(expected < FEW)) > OFTEN


def fitted(panel: Panel, level: float) -> tuple[Fitted, ...]:
    """Every law, over the closed groups from its first age; those with enough groups."""
    found = (fitted_one(key, panel, level) for key in FROM)
    return tuple(one for one in found if one is not None)


def fitted_one(key: str, panel: Panel, level: float) -> Fitted | None:
    """One law; None where it has no more groups than parameters."""
    law, grid = laws.LAWS[key], panel.grid
    inside = slice(int(np.searchsorted(grid.starts, FROM[key])), len(grid) - 1)
    if inside.stop - inside.start <= len(law.names):
        return None
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
        limited(float(mode.age), float(mode.se), level),
        limited(float(found.slope), slope_se, level),
        level,
    )


def best(found: Sequence[Fitted]) -> Fitted | None:
    """Of the laws fitted to adults, the one with the least AIC; of equals the first."""
    adult = [one for one in found if one.found and one.first >= ADULT]
    return min(adult, key=lambda one: float(one.fit.aic), default=None)


def rivals(found: Sequence[Fitted], of: Fitted) -> tuple[Fitted, ...]:
    """Other laws fitted to the same ages that describe them hardly less well. One with a term held
    at 0 is no other law.

    Source: Burnham & Anderson (2002), Model Selection and Multimodel Inference, section 2.6.
    """
    return tuple(
        one
        for one in found
        if one.found
        and one is not of
        and one.first == of.first
        and not one.bounded
        and float(one.fit.aic - of.fit.aic) < NEAR
    )
