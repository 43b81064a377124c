"""Two population-years and the explained difference between them: this less that."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from engine import decomposition, indicators
from engine import settings as named
from engine.ages import AgeGrid, Array
from engine.chain import run
from engine.estimates import Estimate, Reason
from engine.panel import Panel
from engine.settings import Settings
from engine.tables import LifeTable
from server.results.estimating import USUAL, differences, estimates, stream
from server.results.loading import Holdings, Loaded, holdings, load, overlap, shared_deaths
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
    overlap: PopulationYear | None  # deaths counted in both
    difference: dict[str, Estimate]
    contributions: dict[str, Contribution]  # by indicator; missing where one side is undefined
    arriaga: Array  # [age], for e0
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
    collection = heading.collection
    settings = named.find(question.settings)
    held = holdings(session, collection.code, heading.edition.number)
    for wanted in (question.this, question.that):
        held.require(wanted)
    both = overlap(question.this, question.that, held.areas)
    asked = [question.this, question.that, *([both] if both else [])]
    loaded = load(session, collection.code, heading.edition.number, asked)
    this, that = _sides(collection.code, question, loaded, settings)
    shared = shared_deaths(loaded.get(both) if both else None, this.panel, that.panel)
    codes = (stream(collection.code, question.this), stream(collection.code, question.that))
    difference = differences(
        this.estimates,
        this.panel,
        that.panel,
        settings,
        codes,
        shared=shared,
    )
    groups = _groups(this.panel.grid)
    if question.this == question.that:
        difference = {key: _no_sampling(estimate) for key, estimate in difference.items()}
    return Comparison(
        heading=heading,
        holdings=held,
        question=question,
        settings=settings,
        grid=this.panel.grid,
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
        arriaga=decomposition.arriaga(this.table, that.table),
        moved=moved(
            session,
            heading,
            asked[:2],
            lambda newer: headline(question, newer, settings),
        ),
    )


def headline(
    question: ComparisonQuestion, loaded: dict[PopulationYear, Loaded], settings: Settings
) -> float:
    """The difference asked for; KeyError where one of the two was not loaded."""
    this, that = loaded[question.this].panel, loaded[question.that].panel
    grid = this.grid.common(that.grid)
    indicator = indicators.find(question.of)
    return float(
        indicators.difference(indicator, this.regroup(grid), that.regroup(grid), settings).value
    )


def _sides(
    collection: str,
    question: ComparisonQuestion,
    loaded: dict[PopulationYear, Loaded],
    settings: Settings,
) -> tuple[Side, Side]:
    keys = USUAL if question.of in USUAL else (*USUAL, question.of)
    wanted = (question.this, question.that)
    grid = loaded[wanted[0]].panel.grid.common(loaded[wanted[1]].panel.grid)
    sides = []
    for one in wanted:
        panel = loaded[one].panel.regroup(grid)
        sides.append(
            Side(
                one,
                loaded[one],
                panel,
                run(panel, settings).table,
                estimates(keys, panel, settings, stream(collection, one)),
            )
        )
    return sides[0], sides[1]


def _groups(grid: AgeGrid) -> AgeGrid:
    return AgeGrid(tuple(start for start in grid.starts if start % 5 == 0 or start == 1))


def _contribution(
    key: str,
    this: Side,
    that: Side,
    settings: Settings,
    codes: tuple[NDArray[np.str_], NDArray[np.str_]],
    shared: Array | None,
    groups: AgeGrid,
) -> Contribution:
    indicator = indicators.find(key)
    parts = decomposition.contributions(indicator, this.panel, that.panel, settings)
    low, high = decomposition.contribution_limits(
        indicator, this.panel, that.panel, settings, streams=codes, shared=shared, groups=groups
    )
    return Contribution(
        parts.by_age,
        this.panel.grid.regroup(parts.by_age, groups),
        low,
        high,
        float(parts.remainder),
        float(parts.difference),
    )


def _no_sampling(estimate: Estimate) -> Estimate:
    """The same deaths on both sides: the difference is exact."""
    gap = np.full_like(estimate.value, np.nan)
    known = estimate.reason == Reason.NONE
    return replace(
        estimate,
        low=gap,
        high=gap,
        reason=np.where(known, Reason.NO_SAMPLING_INTERVAL, estimate.reason).astype(np.uint8),
    )
