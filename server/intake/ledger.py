"""All vectors of an upload together: what stands beside what."""

from collections.abc import Iterator
from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np

from engine.ages import AgeGrid, Array
from engine.panel import SEXES
from server.intake.cells import SEX_UNSTATED, Flags, Ints, parts_of, place_of, sexes_of
from server.intake.labels import NOT_STATED
from server.intake.mapping import WITHOUT_AGE
from server.intake.problems import Text, Value
from server.intake.schedules import Aside, Block
from server.intake.standing import Standing

Line = tuple[Block, int]  # a block and which of its lines
Group = tuple[tuple[int, int], float]  # first and last age, and how many


@dataclass(frozen=True, slots=True)
class Pair:
    """Deaths and person-years of the same places, each on its own grid, and the common one."""

    deaths: Block
    people: Block
    grid: AgeGrid


def _nowhere() -> Ints:
    return np.zeros(0, np.int64)


@dataclass(frozen=True)
class Ledger:
    """Vectors, and what was found around them."""

    codes: tuple[str, ...]  # of the areas, in order
    whole: int  # number of the area of which the others are parts; -1: there is none
    delivered: frozenset[int]  # numbers of areas kept as delivered
    blocks: tuple[Block, ...]
    spoiled: Ints  # places with errors or unknown counts; what is missing there is not missed
    unplaced: bool  # rows exist whose area, sex or year is not known, or files that were not read
    elsewhere: bool  # the edition that stands has parts of the whole that are not handed in here
    age_totals: tuple[Aside, ...]
    ageless: tuple[Aside, ...]  # counts of unknown age
    grouped: tuple[Aside, ...]  # counts by age whose area or sex is not known
    standing: Standing | None = None  # None: nothing is known of what stands
    # of `spoiled` those without an error: a count is not available there
    unknown: Ints = field(default_factory=_nowhere)

    @property
    def faulty(self) -> bool:
        """Whether there are places with errors."""
        return len(self.spoiled) > len(self.unknown)

    @cached_property
    def past(self) -> tuple[Block, ...]:
        """Deaths and person-years of the areas handed in, as the edition that stands has them."""
        return self.standing.blocks(self.codes) if self.standing else ()

    def of(self, measure: str) -> tuple[Block, ...]:
        return tuple(block for block in self.blocks if block.measure == measure)

    @cached_property
    def lines(self) -> dict[str, dict[int, Line]]:
        """By measure and place."""
        found: dict[str, dict[int, Line]] = {}
        for block in self.blocks:
            places = found.setdefault(block.measure, {})
            places.update((place, (block, line)) for line, place in enumerate(block.place.tolist()))
        return found

    @cached_property
    def of_no_age(self) -> dict[str, dict[int, float]]:
        """Counts of unknown age, by measure and place."""
        return _by_place(self.ageless)

    @cached_property
    def by_age(self) -> dict[str, dict[int, list[Group]]]:
        """Counts by age whose area or sex is not known, by measure and place."""
        found: dict[str, dict[int, list[Group]]] = {}
        for aside in self.grouped:
            places = found.setdefault(aside.measure, {})
            for place, count in zip(aside.place.tolist(), aside.values.tolist(), strict=True):
                places.setdefault(place, []).append((aside.ages or (0, 0), count))
        return found

    @cached_property
    def at_all_ages(self) -> dict[str, dict[int, float]]:
        """Totals over the ages as delivered, by measure and place."""
        return _by_place(self.age_totals)

    def places(self, measure: str) -> Ints:
        """All places that have the measure, in order."""
        none = np.zeros(0, np.int64)
        places: Ints = np.concatenate([none, *(block.place for block in self.of(measure))])
        places.sort()
        return places

    def named(self, place: int) -> dict[str, Value]:
        """Area, sex and year of a place, as values of a fault."""
        area, sex, year = parts_of(place)
        return {**self.named_area(area), "sex": (*SEXES, Text(NOT_STATED))[sex], "year": str(year)}

    def named_area(self, area: int) -> dict[str, Value]:
        return {"area": (*self.codes, Text(NOT_STATED))[area]}

    def states(self, places: Ints) -> Flags:
        """Whether a place says of which area and sex its counts are."""
        area, sex, _ = parts_of(places)
        return np.asarray((area < len(self.codes)) & (sex < SEX_UNSTATED))

    def is_total(self, places: Ints, measure: str) -> Flags:
        """Whether what stands there is in other lines too: persons beside women and men, the whole
        beside any part."""
        area, _, _ = parts_of(places)
        areas = parts_of(self.places(measure))[0]
        beside = self.whole >= 0 and bool((areas != self.whole).any())
        twice = np.isin(places, self.both_sexes(measure))
        return np.asarray(twice | (beside & (area == self.whole)))

    def both_sexes(self, measure: str) -> Ints:
        """Places of persons where women and men have the measure too."""
        places = self.places(measure)
        persons: Ints = places[parts_of(places)[1] == SEXES.index("p")]
        if not len(persons):
            return persons
        women, men = sexes_of(persons)
        both: Ints = persons[np.isin(women, places) & np.isin(men, places)]
        return both

    def parts(self, place: int, measure: str) -> tuple[list[int], list[str]]:
        """Places of the parts at a place of the whole, and codes of the parts that have none."""
        _, sex, year = parts_of(place)
        lines = self.lines.get(measure, {})
        found, missing = [], []
        for area, code in enumerate(self.codes):
            if area == self.whole:
                continue
            at = place_of(area, sex, year)
            if at in lines:
                found.append(at)
            else:
                missing.append(code)
        return found, missing

    def wholes(self, measure: str) -> list[int]:
        """Places of the whole that have the measure."""
        places = self.places(measure)
        return [int(place) for place in places[parts_of(places)[0] == self.whole]]

    def without_totals(self) -> "Ledger":
        """Without what is summed anyway: persons beside both sexes, the whole beside all parts."""
        kept = []
        for block in self.blocks:
            drop = np.isin(block.place, self.both_sexes(block.measure))
            if self.whole >= 0 and self.whole not in self.delivered:
                summed = [
                    place
                    for place in self.wholes(block.measure)
                    if not self.parts(place, block.measure)[1]
                ]
                drop |= np.isin(block.place, summed)
            kept.append(block.pick(~drop) if drop.any() else block)
        return replace(self, blocks=tuple(block for block in kept if len(block.place)))

    @cached_property
    def pairs(self) -> tuple[Pair, ...]:
        """Deaths and person-years side by side, a pair for each two blocks that share places."""
        deaths, people = self.of("deaths"), self.of("person_years")
        here, there = _where(deaths), _where(people)
        _, left, right = np.intersect1d(here[:, 0], there[:, 0], return_indices=True)
        met = np.column_stack([here[left, 1:], there[right, 1:]])
        found = []
        for one, other in dict.fromkeys(map(tuple, met[:, [0, 2]].tolist())):
            both = (met[:, 0] == one) & (met[:, 2] == other)
            grid = deaths[one].grid.common(people[other].grid)
            found.append(
                Pair(deaths[one].pick(met[both, 1]), people[other].pick(met[both, 3]), grid)
            )
        return tuple(found)

    def on_common_grids(self) -> Iterator[Block]:
        """All vectors, deaths and person-years of a place in the same groups."""
        for pair in self.pairs:
            yield pair.deaths.regroup(pair.grid)
            yield pair.people.regroup(pair.grid)
        paired = [pair.deaths.place for pair in self.pairs] or [np.zeros(0, np.int64)]
        for block in self.blocks:
            if block.measure in WITHOUT_AGE:
                yield block
            else:
                yield block.pick(~np.isin(block.place, np.concatenate(paired)))


def _by_place(asides: tuple[Aside, ...]) -> dict[str, dict[int, float]]:
    found: dict[str, dict[int, float]] = {}
    for aside in asides:
        known = zip(aside.place.tolist(), aside.values.tolist(), strict=True)
        found.setdefault(aside.measure, {}).update(known)
    return found


def _where(blocks: tuple[Block, ...]) -> Ints:
    """[line, (place, block, line of the block)]"""
    rows = [
        np.column_stack(
            [block.place, np.full(len(block.place), number), np.arange(len(block.place))]
        )
        for number, block in enumerate(blocks)
    ]
    return np.concatenate(rows) if rows else np.zeros((0, 3), np.int64)


def summed(lines: list[Line], grid: AgeGrid) -> Array:
    """Sum of some lines on a grid all of them can be brought to, [age]."""
    parts = [block.grid.regroup(block.values[line], grid) for block, line in lines]
    return np.asarray(np.sum(parts, axis=0), np.float64)


def common_grid(lines: list[Line]) -> AgeGrid:
    grid = lines[0][0].grid
    for block, _ in lines[1:]:
        grid = grid.common(block.grid)
    return grid
