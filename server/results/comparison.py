"""Two population-years and the explained difference between them: this less that."""

from collections.abc import Sequence
from dataclasses import dataclass
from functools import reduce

import numpy as np
from numpy.typing import NDArray

from engine import decomposition, indicators
from engine import settings as named
from engine.ages import AgeGrid, Array
from engine.chain import run
from engine.estimates import Estimate
from engine.panel import Panel
from engine.settings import Settings
from engine.tables import LifeTable
from server.results.estimating import COMPARED, differences, estimates, stream
from server.results.loading import (
    Beside,
    Found,
    Holdings,
    Loaded,
    Shared,
    holdings,
    load,
    overlap,
    shared_part,
)
from server.results.questions import ComparisonQuestion, PopulationYear
from server.results.revision import Moved, moved
from server.store.connect import Session
from server.store.heading import Heading

DECOMPOSED = ("e0", "H")


@dataclass(frozen=True, slots=True)
class Side:
    """One of the two, on the grid they share."""

    of: PopulationYear
    loaded: Loaded  # as delivered, on its own grid
    panel: Panel
    table: LifeTable
    estimates: dict[str, Estimate]


@dataclass(frozen=True, slots=True)
class Contribution:
    """What each age adds to a difference; the remainder belongs to no age."""

    by_age: Array  # [age]
    by_group: Array  # [group], the same summed, with the limits of the sums
    low: Array
    high: Array
    remainder: float
    difference: float


@dataclass(frozen=True, slots=True)
class Comparison:
    """All that is known of the difference between two population-years."""

    heading: Heading
    holdings: Holdings
    question: ComparisonQuestion
    settings: Settings
    grid: AgeGrid  # the finest both can be summed to
    groups: AgeGrid  # the same in groups of at least five years after the first, for pictures
    this: Side
    that: Side
    overlap: Shared | None  # deaths counted in both; None also where they are not held
    difference: dict[str, Estimate]
    contributions: dict[str, Contribution]  # by indicator; missing where one side is undefined
    arriaga: Array  # [age] of `grid`, for e0
    moved: Moved | None

    @property
    def same(self) -> bool:
        """The same population-year on both sides: nothing can differ."""
        return self.question.this == self.question.that

    @property
    def regrouped(self) -> tuple[PopulationYear, ...]:
        """The sides whose own ages were finer than the grid they share."""
        return tuple(
            side.of for side in (self.this, self.that) if side.loaded.panel.grid != self.grid
        )


def comparison(session: Session, heading: Heading, question: ComparisonQuestion) -> Comparison:
    """Load both, bring them to one grid, take the difference apart. NotInEdition."""
    collection, number = heading.collection.code, heading.edition.number
    settings = named.find(question.settings)
    held = holdings(session, collection, number)
    for wanted in (question.this, question.that):
        held.require(wanted)
    both = overlap(question.this, question.that, held.areas, settings.years)
    asked: list[PopulationYear | Shared] = [question.this, question.that]
    asked += [both] if both else []
    beside = Beside.of(settings, held.areas, indicators.find(question.of))
    loaded = load(session, collection, number, asked, beside)
    for wanted in (question.this, question.that):
        if wanted not in loaded:
            raise held.lacks(wanted)
    if both not in loaded:
        both = None
    grid = _shared_grid(loaded)
    keys = tuple(dict.fromkeys((*COMPARED, question.of)))
    this, that = (
        _side(collection, one, loaded[one], grid, settings, keys)
        for one in (question.this, question.that)
    )
    shared = shared_part(loaded[both].panel, this.panel, that.panel) if both else None
    codes = (stream(collection, question.this), stream(collection, question.that))
    difference = differences(keys, this.panel, that.panel, settings, codes, shared=shared)
    groups = _groups(grid)
    return Comparison(
        heading=heading,
        holdings=held,
        question=question,
        settings=settings,
        grid=grid,
        groups=groups,
        this=this,
        that=that,
        overlap=both,
        difference=difference,
        contributions={
            key: _contribution(key, this, that, settings, codes, shared, groups)
            for key in DECOMPOSED
            if np.isfinite(difference[key].value)
        },
        arriaga=_on(grid, decomposition.arriaga(this.table, that.table)),
        moved=moved(
            session, heading, asked, beside, lambda newer: _headline(question, newer, settings)
        ),
    )


def _headline(question: ComparisonQuestion, loaded: Found, settings: Settings) -> float:
    """The difference asked for, as the page of these population-years has it; nan where one of the
    two is not held."""
    if not {question.this, question.that} <= loaded.keys():
        return np.nan
    grid = _shared_grid(loaded)
    this, that = (loaded[one].panel.regroup(grid) for one in (question.this, question.that))
    return float(indicators.difference(indicators.find(question.of), this, that, settings).value)


def _shared_grid(loaded: Found) -> AgeGrid:
    """The finest to which both sides, and what is counted in both, can be summed."""
    return reduce(AgeGrid.common, (one.panel.grid for one in loaded.values()))


def _side(
    collection: str,
    of: PopulationYear,
    loaded: Loaded,
    grid: AgeGrid,
    settings: Settings,
    keys: Sequence[str],
) -> Side:
    panel = loaded.panel.regroup(grid)
    found = estimates(keys, panel, settings, stream(collection, of))
    return Side(of, loaded, panel, run(panel, settings).table, found)


def _on(grid: AgeGrid, by_age: Array) -> Array:
    """What a table's ages hold, a law's single years summed into the open group they spread."""
    last = len(grid) - 1
    return np.append(by_age[:last], by_age[last:].sum())


def _groups(grid: AgeGrid) -> AgeGrid:
    return AgeGrid(tuple(start for start in grid.starts if start % 5 == 0 or start == 1))


def _contribution(
    key: str,
    this: Side,
    that: Side,
    settings: Settings,
    codes: tuple[NDArray[np.str_], NDArray[np.str_]],
    shared: Panel | None,
    groups: AgeGrid,
) -> Contribution:
    indicator = indicators.find(key)
    parts = decomposition.contributions(indicator, this.panel, that.panel, settings)
    low, high = decomposition.contribution_limits(
        indicator,
        this.panel,
        that.panel,
        settings,
        streams=codes,
        shared=None if shared is None else shared.deaths,
        groups=groups,
    )
    return Contribution(
        parts.by_age,
        this.panel.grid.regroup(parts.by_age, groups),
        low,
        high,
        float(parts.remainder),
        float(parts.difference),
    )
