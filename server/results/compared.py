"""The difference between two loaded populations, with all that explains it."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from engine import ageing, decomposition
from engine.ages import AgeGrid, Array
from engine.chain import run
from engine.estimates import Estimate, Reason
from engine.panel import Panel
from engine.ratios import Ratios, rate_ratios
from engine.settings import Settings
from engine.standards.reference_table import rounding
from engine.standards.remaining_years import REFERENCES
from engine.tables import LifeTable
from server.results import sides
from server.results.cause_parts import Years, side_by_side
from server.results.estimating import COMPARED, differences, estimates, stream
from server.results.explaining import Codes, Explained, Sides, explain
from server.results.holdings import Holdings
from server.results.loading import Loaded, Shared, shared_part
from server.results.protecting import all_protected, withheld_in
from server.results.questions import ComparisonQuestion, PopulationYear
from server.results.rest import Rest
from server.results.revision import Moved
from server.results.sides import Elsewhere, Kind
from server.store.heading import Heading
from server.store.records import Break

SOUND = 0.1  # by which share the rounding of a printed table may put a rate out


@dataclass(frozen=True, slots=True)
class Side:
    """One of the two, on the grid they share."""

    place: "Place"
    loaded: Loaded  # as delivered, on its own grid
    panel: Panel
    table: LifeTable
    borrowed: bool  # its open group, in which nobody died, has the rate of its whole
    early_end: bool  # its open group begins where closing it is a coarse guess
    estimates: dict[str, Estimate]
    rises: ageing.Rises

    @property
    def of(self) -> PopulationYear:
        return self.place.of

    @property
    def sex(self) -> str:
        """A printed table is for both."""
        return "p" if self.place.standard else self.place.of.sex


@dataclass(frozen=True, slots=True)
class Comparison:
    """All that is known of the difference between two population-years."""

    heading: Heading
    holdings: Holdings
    other: Elsewhere | None  # where that side stands, if not in this edition
    question: ComparisonQuestion
    settings: Settings
    kind: Kind
    grid: AgeGrid  # the finest both can be summed to
    groups: AgeGrid  # the same in groups of at least five years after the first, for pictures
    this: Side
    that: Side
    overlap: Shared | None  # deaths counted in both; None also where they are not held
    no_rest: bool  # the rest was asked for, but the whole counts fewer than its part
    difference: dict[str, Estimate]
    explained: Explained
    ratios: Ratios  # of the rates, by group
    arriaga: Array  # [age] of `grid`, for e0
    pollard: Array
    moved: Moved | None

    @property
    def same(self) -> bool:
        """The same population-year of one edition on both sides: nothing can differ."""
        return self.kind == "plain" and self.question.this == self.question.that

    def mixed(self, side: Side) -> tuple[Break, ...]:
        """The breaks on both sides of which the years added up for a side lie."""
        place = side.place
        return () if place.standard else place.holdings.mixed(place.of, self.settings.years)

    @property
    def withheld(self) -> NDArray[np.bool_]:
        """Groups of the grid in which a side withholds deaths, [age]."""
        return withheld_in(self.grid, self.this.loaded, self.that.loaded)

    @property
    def rounded(self) -> NDArray[np.bool_]:
        """Groups in which the rounding of a printed table leaves its rate less sure than a tenth,
        [group]; none where both sides are counted."""
        key = self.that.place.standard
        if not key:
            return np.zeros(len(self.groups), np.bool_)
        of = REFERENCES[key]
        by_age = dict(zip(of.ages, rounding(of), strict=False))
        return np.array([by_age.get(start, 0.0) > SOUND for start in self.groups.starts])

    @property
    def regrouped(self) -> tuple[Side, ...]:
        """The sides whose own ages were finer than the grid they share."""
        both = (self.this, self.that)
        return tuple(
            side for side in both if not side.place.standard and side.loaded.panel.grid != self.grid
        )


@dataclass(frozen=True, slots=True)
class Asked:
    """A question, and the editions it is put to."""

    heading: Heading
    held: Holdings
    other: Elsewhere | None
    question: ComparisonQuestion
    settings: Settings

    def side(self, of: PopulationYear, pair: sides.Pair, *, that: bool) -> "Place":
        is_rest = pair.rest is not None and of == pair.whole
        elsewhere = self.other if that else None
        return Place(
            of,
            pair.rest if is_rest else None,
            elsewhere.heading if elsewhere else self.heading,
            elsewhere.holdings if elsewhere else self.held,
            self.question.standard if that else "",
        )


@dataclass(frozen=True, slots=True)
class Place:
    """What a side is, before its numbers."""

    of: PopulationYear  # of a rest the whole; of a printed table the other side
    rest: Rest | None  # set where it is what is left of `of` without a part
    heading: Heading  # where its counts stand
    holdings: Holdings
    standard: str  # key of the printed table that it is; empty: it is counted

    @property
    def codes(self) -> Codes:
        """What its draws are keyed by."""
        if self.rest:
            return np.array(f"{self.heading.collection.code}/{self.rest.code}", dtype=np.str_)
        if self.standard:
            return np.array(f"/{self.standard}", dtype=np.str_)
        return stream(self.heading.collection.code, self.of)


def compared(
    asked: Asked, pair: sides.Pair, years: Sequence[Loaded], newer: Moved | None
) -> Comparison:
    """The difference between two loaded sides, taken apart. No statement."""
    question, settings = asked.question, asked.settings
    kind = sides.kind(question, pair.rest)
    places = asked.side(question.this, pair, that=False), asked.side(question.that, pair, that=True)
    grid = shared_grid(pair)
    keys = tuple(dict.fromkeys((*COMPARED, question.of)))
    this, that = (
        _side(place, loaded, grid, settings, keys)
        for place, loaded in zip(places, (pair.this, pair.that), strict=True)
    )
    shared = shared_part(pair.shared.panel, this.panel, that.panel) if pair.shared else None
    codes = (places[0].codes, places[1].codes)
    found = (
        _revised(this.estimates, that.estimates)
        if kind == "revision"
        else differences(keys, this.panel, that.panel, settings, codes, shared=shared)
    )
    difference = all_protected(found, this.loaded, that.loaded)
    this, that = (
        replace(side, estimates=all_protected(side.estimates, side.loaded)) for side in (this, that)
    )
    groups = grid.fives
    return Comparison(
        heading=asked.heading,
        holdings=asked.held,
        other=asked.other,
        question=question,
        settings=settings,
        kind=kind,
        grid=grid,
        groups=groups,
        this=this,
        that=that,
        overlap=pair.overlap,
        no_rest=pair.no_rest,
        difference=difference,
        explained=explain(
            question.of,
            {key for key, one in difference.items() if np.isfinite(one.value)},
            Sides(
                this.panel,
                that.panel,
                shared,
                codes,
                groups,
                by_chance=kind != "revision",
                causes=side_by_side(pair.this, pair.that, pair.shared, grid),
                thresholds=_thresholds(this, that),
            ),
            _between(years, grid),
            settings,
        ),
        ratios=_ratios(this, that, shared, groups, settings, exact=kind == "revision"),
        arriaga=_on(grid, decomposition.arriaga(this.table, that.table)),
        pollard=_on(grid, decomposition.pollard(this.table, that.table)),
        moved=newer,
    )


def _side(
    place: Place, loaded: Loaded, grid: AgeGrid, settings: Settings, keys: Sequence[str]
) -> Side:
    panel = loaded.panel.regroup(grid)
    found = estimates(keys, panel, settings, place.codes)
    if place.standard:
        found = {key: _known(one) for key, one in found.items()}
    chain = run(panel, settings)
    return Side(
        place,
        loaded,
        panel,
        chain.table,
        bool(chain.borrowed),
        chain.open_low,
        found,
        ageing.rises(panel, level=settings.level),
    )


def _thresholds(this: Side, that: Side) -> tuple[Estimate, Estimate] | None:
    """The ages up to which fewer deaths make length of life more even."""
    key = "threshold_H"
    if key not in this.estimates:
        return None
    return this.estimates[key], that.estimates[key]


def _known(one: Estimate) -> Estimate:
    """A figure of a printed table: chance has no part in it."""
    return Estimate.bare(one.value, _without_interval(one), Reason.A_STANDARD)


def _without_interval(one: Estimate) -> NDArray[np.uint8]:
    """Why there is no value; none where there is one, whatever its interval."""
    return np.where(np.isfinite(one.value), Reason.NONE, one.reason).astype(np.uint8)


def _revised(this: dict[str, Estimate], that: dict[str, Estimate]) -> dict[str, Estimate]:
    """Differences between two editions of one population-year: the same people counted again, which
    leaves nothing to chance."""
    found = {}
    for key, here in this.items():
        there = that[key]
        reasons = [_without_interval(one) for one in (here, there)]
        reason = np.where(reasons[0] == Reason.NONE, reasons[1], reasons[0]).astype(np.uint8)
        found[key] = Estimate.bare(here.value - there.value, reason, Reason.NO_SAMPLING_INTERVAL)
    return found


def shared_grid(pair: sides.Pair) -> AgeGrid:
    """The finest to which both sides, and what is counted in both, can be summed."""
    grid = pair.this.panel.grid.common(pair.that.panel.grid)
    return grid if pair.shared is None else grid.common(pair.shared.panel.grid)


def _ratios(
    this: Side,
    that: Side,
    shared: Panel | None,
    groups: AgeGrid,
    settings: Settings,
    *,
    exact: bool,
) -> Ratios:
    """Of the rates by group; `exact`: without limits, since the same deaths were counted again."""
    both = None if shared is None else shared.regroup(groups)
    found = rate_ratios(
        this.panel.regroup(groups), that.panel.regroup(groups), settings, shared=both
    )
    gone = np.full(len(groups), np.nan)
    return replace(found, low=gone, high=gone) if exact else found


def _between(years: Sequence[Loaded], grid: AgeGrid) -> Years | None:
    """All years from that to this on the grid; None where there is none between, or one has coarser
    groups."""
    fine = all(set(grid.starts) <= set(year.panel.grid.starts) for year in years)
    if len(years) < 3 or not fine:
        return None
    panel = Panel.stack([year.panel.regroup(grid) for year in years])
    return Years.of(panel, years)


def _on(grid: AgeGrid, by_age: Array) -> Array:
    """What a table's ages hold, a law's single years summed into the open group they spread."""
    last = len(grid) - 1
    return np.append(by_age[:last], by_age[last:].sum())
