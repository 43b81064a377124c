"""A life table whose deaths are parted by cause, and what moves a number read off it."""

from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np

from engine.ages import Array
from engine.causes.counts import CauseCounts
from engine.chain import Chain, run
from engine.chance import Chance
from engine.decomposition.line import require_all
from engine.panel import Panel
from engine.settings import Settings
from engine.stages.rates import death_rates
from engine.tables import Partials


@dataclass(frozen=True, slots=True)
class Slopes:
    """A number of every cause: its value, its derivatives by the table's columns with the cause's
    own rate held, and those by that rate, all with the cause first."""

    value: Array  # [cause, ...]
    partials: Partials  # [cause, ..., age] on the grid of the table
    own: Array  # [cause, ..., age] on the grid of the table


@dataclass(frozen=True, slots=True)
class Moves:
    """Derivatives of a number of every cause in raw rates, [cause, ..., age of the panel]."""

    own: Array  # by the rate of the cause, that of all causes held
    all: Array  # by the rate of all causes, that of the cause held

    @property
    def by_rate(self) -> Array:
        """By the rate of the cause, the rates of all others held."""
        return self.own + self.all


@dataclass(frozen=True, slots=True)
class Parted:
    """A chain and the share of each cause in the deaths of its table.

    A table as counted has the causes' own rates. Where its rate at an age is another (smoothed,
    borrowed, a fitted law's), the deaths there are parted as those counted at the age, above the
    open age as those counted in the open group; where nobody died, as all deaths together (taken as
    known where a number's derivatives are asked).
    Causes come first here, [cause, ..., age].
    """

    chain: Chain
    causes: CauseCounts  # [..., cause, age]
    counted_share: Array  # on the grid of the panel
    share: Array  # on the grid of the table

    @property
    def mx(self) -> Array:
        """The rate of each cause in the table."""
        return self.share * self.chain.table.mx

    def moves(self, slopes: Slopes) -> Moves:
        """A number's derivatives in the raw rates."""
        chain = self.chain
        given = 0.0 if slopes.partials.mx is None else slopes.partials.mx
        by_mx = given + slopes.own * self.share
        through = chain.pull(replace(slopes.partials, mx=by_mx))
        held = chain.rates.pull(self._per_raw(slopes.own))
        return Moves(held, through - self._shared(held))

    def _per_raw(self, own: Array) -> Array:
        """Derivative by the cause's raw rate through its share, the rates of the table held."""
        table, grid, raw = self.chain.table, self.chain.panel.grid, self.chain.rates.mx
        with np.errstate(all="ignore"):
            carried = table.grid.regroup(own * table.mx, grid) / raw
        as_counted = np.where(
            np.real(table.grid.regroup(table.mx, grid)) == 0, table.grid.regroup(own, grid), 0.0
        )
        return np.where(np.real(raw) > 0, carried, as_counted)

    def _shared(self, held: Array) -> Array:
        """The same by the rate of all causes: a share falls as they rise."""
        return np.where(held == 0, 0.0, held * self.counted_share)

    def chance(self, slopes: Slopes) -> Chance:
        """What a death counted of the cause, and one of any other, moves the number by."""
        moves, rates = self.moves(slopes), self.chain.rates
        own, others = rates.per_death(moves.by_rate), rates.per_death(moves.all)
        counts, worth = (cause_first(part) for part in (self.causes.counts, self.causes.worth))
        rest = _others(counts, worth)
        return Chance(
            np.concatenate([own * worth, others * rest.worth], axis=-1),
            np.concatenate([np.broadcast_to(counts, own.shape), rest.counts], axis=-1),
            np.zeros(own.shape[:-1]),
        )


def part(panel: Panel, causes: CauseCounts, settings: Settings) -> Parted:
    """The panel's life tables with their deaths by cause.

    Shape:   panel [..., age], causes [..., cause, age].
    Missing: nan where a death of the age is not known; as `run`.
    Raises:  ValueError where the causes do not add up to all deaths.
    """
    require_all(panel, causes.deaths)
    chain, deaths = run(panel, settings), cause_first(causes.deaths)
    raw = death_rates(deaths, np.ascontiguousarray(np.broadcast_to(panel.exposure, deaths.shape)))
    with np.errstate(all="ignore"):
        together = deaths.sum(axis=-1) / panel.deaths.sum(axis=-1)
        seen = np.real(chain.rates.mx) > 0
        share = np.where(seen, raw.mx / chain.rates.mx, together[..., None])
    place = np.minimum(np.arange(len(chain.table.grid)), len(panel.grid) - 1)
    return Parted(chain, causes, share, np.ascontiguousarray(share[..., place]))


def cause_first(by_cause: Array) -> Array:
    """[..., cause, age] -> [cause, ..., age]"""
    return np.ascontiguousarray(np.moveaxis(by_cause, -2, 0))


class _Others(NamedTuple):
    """Deaths of all causes but one as one count of which each stands for so many."""

    counts: Array
    worth: Array


def _others(counts: Array, worth: Array) -> _Others:
    """Of the same deaths and the same variance as the causes' own counts, which may each stand for
    another number of deaths: sum k C and sum k^2 C, [cause, ..., age]."""
    deaths, variance = counts * worth, counts * worth**2
    rest, spread = (np.maximum(one.sum(axis=0) - one, 0.0) for one in (deaths, variance))
    with np.errstate(all="ignore"):
        each = np.where(rest > 0, spread / rest, 1.0)
        return _Others(np.where(spread > 0, rest / each, 0.0 * rest), each)
