"""The chain of stages that turns a panel into a life table, and its pullback to the raw rates."""

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from engine.panel import Panel
from engine.settings import Settings
from engine.stages.open_interval import OPEN_INTERVALS, Closed
from engine.stages.rates import Rates, death_rates, given_rates
from engine.stages.separation import Separation, separate
from engine.stages.smoothing import SMOOTHINGS, Smoothed
from engine.tables import LifeTable, Partials, from_rates
from engine.tables import pull as pull_table


@dataclass(frozen=True, slots=True)
class Chain:
    """A panel taken through the stages of its settings.

    `rates` is on the panel's grid; `table` is on that grid too, or, where a law spreads the open
    group, on one that runs in single years up to 130.
    """

    panel: Panel
    settings: Settings
    rates: Rates  # as counted
    smoothed: Smoothed
    closed: Closed
    separation: Separation
    table: LifeTable

    @property
    def modelled(self) -> bool:
        """Whether a fitted law stands above the open age."""
        return self.closed.law_from is not None

    @property
    def borrowed(self) -> NDArray[np.bool_]:
        """Whether the rate of the open group is that of the whole, [...]."""
        return self.closed.borrowed

    @property
    def mx(self) -> Array:
        """The rates that the table rests on, on the panel's grid: as counted, and that of the open
        group as borrowed where it is. `run` with these as `mx` gives the same table."""
        own, last = self.rates.mx, self.closed.mx[..., -1:]
        return np.where(
            self.borrowed[..., None] & (np.arange(own.shape[-1]) == own.shape[-1] - 1), last, own
        )

    @property
    def open_too_low(self) -> bool:
        """Whether the open group begins too low to be closed by its own death rate at all."""
        return not self.modelled and self.panel.grid.open_age < self.settings.least_open_age

    @property
    def open_low(self) -> bool:
        """Whether it begins so low that expectations of life closed by its rate need a caution."""
        return not self.modelled and self.panel.grid.open_age < self.settings.sound_open_age

    @property
    def open_reach(self) -> Array:
        """Share of births that reach the open age of the panel's grid, [...]."""
        return self.table.lx[..., len(self.panel.grid) - 1]

    def pull(self, partials: Partials) -> Array:
        """Gradient in the raw mx of the panel's grid, exposure held, from partials by column."""
        g = pull_table(self.table, partials)
        by_closed = self.closed.pull(g.mx + self.separation.pull(g.ax))
        return self.rates.pull(self.smoothed.pull(by_closed))


@dataclass(frozen=True, slots=True)
class Tally:
    """A count that chance moves, and what each one counted weighs in the number: value = count *
    weight. What it rests on is not in the life table, so it has no gradient in the rates."""

    count: Array  # [...]
    weight: Array  # [...]


Slopes = Partials | Array | Tally


class Reading(Protocol):
    """A number read off a chain: what the methods here need of an indicator."""

    @property
    def label(self) -> str: ...

    @property
    def smooth(self) -> bool: ...

    @property
    def why_not_smooth(self) -> str: ...

    @property
    def value(self) -> Callable[[Chain], Array]:
        """-> [...]"""

    @property
    def partials(self) -> Callable[[Chain], Slopes]:
        """Derivatives by the table's columns; or, read off the rates, by `chain.rates.mx`."""


def gradient(reading: Reading, chain: Chain) -> Array:
    """d value / d raw mx, [..., age] on the panel's grid, exposure and infants' mix held.

    Raises: ValueError where the number has no derivative, with the reason.
    """
    if not reading.smooth:
        raise ValueError(
            f"{reading.label} has no derivative by death rates: {reading.why_not_smooth}"
        )
    partials = reading.partials(chain)
    if isinstance(partials, Partials):
        return chain.pull(partials)
    if isinstance(partials, Tally):
        raise ValueError(f"{reading.label} is a count over births, not read off death rates")
    return chain.rates.pull(partials)


def run(panel: Panel, settings: Settings, *, mx: Array | None = None) -> Chain:
    """The panel's life tables.

    With `mx` [..., age] the rates are taken from there, each group for itself, and the panel gives
    only person-years and the infants' mix: so the chain can be followed along a path of rates, or
    stepped into the complex plane.

    Missing: nan rates give nan where they matter; open groups without deaths close at nan by 1 / m.
    """
    deaths, exposure = np.broadcast_arrays(panel.deaths, panel.exposure)
    exposure = np.ascontiguousarray(exposure)
    if mx is None:
        rates = death_rates(np.ascontiguousarray(deaths), exposure)
    else:
        rates = given_rates(np.ascontiguousarray(mx), exposure)
    smoothed = SMOOTHINGS[settings.smoothing](panel.grid, rates, settings)
    read = replace(rates, mx=smoothed.mx)
    closed = OPEN_INTERVALS[settings.open_interval](panel, read, settings)
    separation = separate(closed, panel.infant_weight, panel.infant_ratio, settings)
    table = from_rates(closed.grid, closed.mx, separation.ax)
    return Chain(panel, settings, rates, smoothed, closed, separation, table)
