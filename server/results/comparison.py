"""Two population-years and the explained difference between them: this less that."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
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
from server.results.explaining import Explained, Sides, explain
from server.results.holdings import Holdings, holdings
from server.results.loading import Beside, Found, Loaded, Shared, load, overlap, shared_part
from server.results.protecting import all_protected, withheld_in
from server.results.questions import ComparisonQuestion, PopulationYear
from server.results.revision import Moved, moved
from server.store.connect import Session
from server.store.heading import Heading
from server.store.records import Break


@dataclass(frozen=True, slots=True)
class Side:
    """One of the two, on the grid they share."""

    of: PopulationYear
    loaded: Loaded  # as delivered, on its own grid
    panel: Panel
    table: LifeTable
    borrowed: bool  # its open group, in which nobody died, has the rate of its whole
    early_end: bool  # its open group begins where closing it is a coarse guess
    estimates: dict[str, Estimate]


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
    explained: Explained
    arriaga: Array  # [age] of `grid`, for e0
    pollard: Array
    moved: Moved | None

    @property
    def same(self) -> bool:
        """The same population-year on both sides: nothing can differ."""
        return self.question.this == self.question.that

    def mixed(self, side: Side) -> tuple[Break, ...]:
        """The breaks on both sides of which the years added up for a side lie."""
        return self.holdings.mixed(side.of, self.settings.years)

    @property
    def withheld(self) -> NDArray[np.bool_]:
        """Groups of the grid in which a side withholds deaths, [age]."""
        return withheld_in(self.grid, self.this.loaded, self.that.loaded)

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
    years = _years_between(question, held, settings)
    beside = Beside.of(settings, held.areas, indicators.find(question.of))
    loaded = load(session, collection, number, [*asked, *years], beside, figures=question.figures)
    for wanted in (question.this, question.that):
        if wanted not in loaded:
            raise held.lacks(wanted, settings.years)
    if both not in loaded:
        both = None
    grid = _shared_grid(loaded, asked)
    keys = tuple(dict.fromkeys((*COMPARED, question.of)))
    this, that = (
        _side(collection, one, loaded[one], grid, settings, keys)
        for one in (question.this, question.that)
    )
    shared = shared_part(loaded[both].panel, this.panel, that.panel) if both else None
    codes = (stream(collection, question.this), stream(collection, question.that))
    difference = all_protected(
        differences(keys, this.panel, that.panel, settings, codes, shared=shared),
        this.loaded,
        that.loaded,
    )
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
        explained=explain(
            question.of,
            {key for key, one in difference.items() if np.isfinite(one.value)},
            Sides(this.panel, that.panel, shared, codes, groups),
            _between(loaded, years, grid),
            settings,
        ),
        arriaga=_on(grid, decomposition.arriaga(this.table, that.table)),
        pollard=_on(grid, decomposition.pollard(this.table, that.table)),
        moved=moved(
            session,
            heading,
            asked,
            beside,
            lambda newer: _headline(question, newer, settings),
            figures=question.figures,
        ),
    )


def _headline(question: ComparisonQuestion, loaded: Found, settings: Settings) -> float:
    """The difference asked for, as the page of these population-years has it; nan where one of the
    two is not held."""
    if not {question.this, question.that} <= loaded.keys():
        return np.nan
    grid = _shared_grid(loaded, loaded)
    this, that = (loaded[one].panel.regroup(grid) for one in (question.this, question.that))
    return float(indicators.difference(indicators.find(question.of), this, that, settings).value)


def _shared_grid(loaded: Found, asked: Iterable[PopulationYear | Shared]) -> AgeGrid:
    """The finest to which both sides, and what is counted in both, can be summed."""
    held = (loaded[one].panel.grid for one in asked if one in loaded)
    return reduce(AgeGrid.common, held)


def _years_between(
    question: ComparisonQuestion, held: Holdings, settings: Settings
) -> tuple[PopulationYear, ...]:
    """All years from that to this, where there are some between two years of one area and sex, the
    edition holds them and no break parts them; not of years added up, which overlap."""
    this, that = question.this, question.that
    step = 1 if this.period > that.period else -1
    years = [
        replace(that, period=f"{year:04}")
        for year in range(int(that.period), int(this.period) + step, step)
    ]
    one_people = (this.area, this.sex) == (that.area, that.sex)
    whole = one_people and settings.years == 1 and all(year in held.status for year in years)
    parted = held.parted(this.period, that.period, this.area)
    return tuple(years) if whole and len(years) > 2 and not parted else ()


def _between(loaded: Found, years: Sequence[PopulationYear], grid: AgeGrid) -> Panel | None:
    """The panels of these years on the grid; None where one is lacking or has coarser groups."""
    panels = [loaded[year].panel for year in years if year in loaded]
    fine = all(set(grid.starts) <= set(panel.grid.starts) for panel in panels)
    if not panels or len(panels) < len(years) or not fine:
        return None
    return Panel.stack([panel.regroup(grid) for panel in panels])


def _side(
    collection: str,
    of: PopulationYear,
    loaded: Loaded,
    grid: AgeGrid,
    settings: Settings,
    keys: Sequence[str],
) -> Side:
    panel = loaded.panel.regroup(grid)
    found = all_protected(estimates(keys, panel, settings, stream(collection, of)), loaded)
    chain = run(panel, settings)
    return Side(of, loaded, panel, chain.table, bool(chain.borrowed), chain.open_low, found)


def _on(grid: AgeGrid, by_age: Array) -> Array:
    """What a table's ages hold, a law's single years summed into the open group they spread."""
    last = len(grid) - 1
    return np.append(by_age[:last], by_age[last:].sum())


def _groups(grid: AgeGrid) -> AgeGrid:
    return AgeGrid(tuple(start for start in grid.starts if start % 5 == 0 or start == 1))
