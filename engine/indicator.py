"""What every indicator states about itself; the entries stand in engine/indicators."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

from engine.ages import Array
from engine.chain import Chain, Slopes
from engine.estimates import Reason

Limits = Literal["mixed", "part", "gamma", "count"]


@dataclass(frozen=True, slots=True)
class Unit:
    """What a printed figure counts. The engine speaks per person-year and in years only; `scale`
    turns its number into the printed one, for display and nowhere else. `limits` says of what
    kind it is, so that the ends of its interval are numbers of the same kind (engine.chance):

    mixed: some deaths raise it and others lower it;
    part:  of a whole, between 0 and 1;
    gamma: a rate, a weighted sum of counts (its limits are exact where the weights are one);
    count: of a count over births, exact. Its indicator gives a Tally in place of derivatives."""

    key: str
    label: str
    scale: float
    decimals: int
    limits: Limits = "mixed"


@dataclass(frozen=True, slots=True)
class Needs:
    """What the counts must hold before the number may be read."""

    ages: tuple[int, ...] = ()  # each begins an age group
    births: tuple[str, ...] = ()  # those of engine.panel.BIRTHS that were handed in
    whole: bool = False  # the panel has the population it is part of
    standard: str = (
        ""  # code of the population-year whose people weight the ages, in Panel.standard
    )
    least_deaths: int = 0  # fewer deaths give no figure
    open_deaths: bool = False  # somebody died in the open group, or a law spreads it
    open_small: bool = False  # at most the settings' share of births reach it, or a law spreads it
    span_deaths: bool = False  # somebody died in the settings' span for the ageing rate
    otherwise: Reason = Reason.TOO_FEW_AGES  # why there is no number though all this holds


def _none(chain: Chain) -> Slopes:
    raise ValueError("this indicator is not smooth and has no partial derivatives")


@dataclass(frozen=True, slots=True)
class Indicator:
    """A number read off a life table, or off rates. Every field would be true in a printed report.

    `partials` are the derivatives by the table's columns for a number read off the table, those by
    the rates [..., age] for one read off rates, and a Tally for a count over births. `redraw` reads
    the number off simulated counts, given the chain of the observed ones, where a choice made on
    the observed counts is to be kept; without it `value` does.
    """

    key: str
    symbol: str
    label: str
    unit: Unit
    definition: str
    formula: str
    source: str
    why_not_smooth: str  # empty where it is smooth
    needs: Needs
    value: Callable[[Chain], Array]
    partials: Callable[[Chain], Slopes] = _none
    redraw: Callable[[Chain, Chain], Array] | None = None  # (observed, simulated)

    @property
    def smooth(self) -> bool:
        """It has a gradient: hence a delta interval, sensitivities and contributions."""
        return not self.why_not_smooth

    @property
    def spread(self) -> bool:
        """It tells how deaths are spread over ages, so the open group must be small or modelled."""
        return self.needs.open_small

    def drawn(self, observed: Chain, simulated: Chain) -> Array:
        """The number read off simulated counts, [...]."""
        return self.value(simulated) if self.redraw is None else self.redraw(observed, simulated)
