"""Rows put in order of area, sex, year and age, and cut into vectors over age."""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace

import numpy as np

from engine.ages import AgeGrid, Array
from server.intake.cells import Cells, Flags, Ints, place_of
from server.intake.mapping import NUMBERS
from server.intake.mapping import Mapping as FileMapping
from server.intake.problems import Fault, Value

MEASURES = {field: field for field in NUMBERS} | {"population": "person_years"}
OLDEST = 999  # beyond every age: the end of what is open
DECIMALS = 6  # counts are rounded to them
RATE = "rate"  # no measure of the store: becomes deaths


@dataclass(frozen=True, slots=True)
class Ordered:
    """The rows of a sheet that have a place and an age, by place and age. All arrays are [row]."""

    cells: Cells
    take: Ints  # which rows of the sheet
    place: Ints
    start: Ints
    end: Ints  # last age of the group as labelled, -1 where the label does not say
    open: Flags
    stated: Flags  # area and sex; of others, ages may be left out where there is nobody
    first: Flags  # first row of its place
    last: Flags
    broken: Flags  # its place has rows whose age cannot be read
    parted: Flags  # rows of unknown place stand in the file between this row and the next
    parted_before: Flags  # and between the row before and this one

    @property
    def row(self) -> Ints:
        return self.cells.sheet.row[self.take]

    def label(self, rows: Flags | Ints) -> "np.ndarray[tuple[int], np.dtype[np.object_]]":
        """Age labels of some of these rows as written; '' in a file without ages."""
        labels = self.cells.sheet.labels.get("age")
        return labels.at(self.take[rows]) if labels else np.full(len(self.take[rows]), "", object)


@dataclass(frozen=True, slots=True)
class Rule:
    """What is to be done with counts that do not state their sex, age or area."""

    chosen: Mapping[str, str]  # "spread" or "left_out", by what is not stated
    most: float  # per cent of a year's counts of an area that may be spread

    @classmethod
    def of(cls, mapping: FileMapping) -> "Rule":
        return cls(dict(mapping.unstated), mapping.most_unstated)


AS_THEY_ARE = Rule({}, 0)


@dataclass(frozen=True, slots=True)
class Block:
    """Vectors of one measure that share a grid, by place; all from one file."""

    measure: str
    file: str
    column: str
    grid: AgeGrid
    place: Ints  # [line]
    provisional: Flags  # [line]
    values: Array  # [line, age]
    row: Ints  # [line, age], row in the file
    rule: Rule = AS_THEY_ARE
    counted: Array | None = None  # of them as counted and stated, where some were shared out
    estimated: bool = False  # worked out from rates

    @property
    def stated(self) -> Array:
        """Counts as they were delivered, [line, age]."""
        return self.values if self.counted is None else self.counted

    def fault(self, rows: Ints, values: Mapping[str, Value]) -> Fault:
        return _fault(self, rows, values)

    def with_counted(self) -> Iterator["Block"]:
        """Itself, and how many were counted and stated where that is fewer."""
        yield self
        if self.counted is not None:
            fewer = self.pick((self.counted != self.values).any(axis=-1))
            yield replace(fewer, measure="counted_deaths", values=fewer.stated, counted=None)

    def pick(self, lines: Flags | Ints) -> "Block":
        return replace(
            self,
            place=self.place[lines],
            provisional=self.provisional[lines],
            values=self.values[lines],
            row=self.row[lines],
            counted=None if self.counted is None else self.counted[lines],
        )

    def regroup(self, to: AgeGrid) -> "Block":
        """The same counts in fewer groups; a group's row is that of its first part."""
        if to == self.grid:
            return self
        starts = [self.grid.position(start) for start in to.starts]
        return replace(
            self,
            grid=to,
            values=self.grid.regroup(self.values, to),
            row=self.row[:, starts],
            counted=None if self.counted is None else self.grid.regroup(self.counted, to),
        )


@dataclass(frozen=True, slots=True)
class Aside:
    """Numbers of one measure that make up no vector: totals over the ages, counts of unknown age,
    and those of one age group of which area or sex are not known."""

    measure: str
    file: str
    column: str
    place: Ints  # [line]
    provisional: Flags
    values: Array
    row: Ints
    rule: Rule
    ages: tuple[int, int] | None  # first and last, OLDEST where it is open; None: not known

    def once(self) -> "Aside":
        """The first line of each place; a second is a fault."""
        return self.pick(np.append(True, self.place[1:] != self.place[:-1])[: len(self.place)])

    def pick(self, lines: Flags | Ints) -> "Aside":
        return replace(
            self,
            place=self.place[lines],
            provisional=self.provisional[lines],
            values=self.values[lines],
            row=self.row[lines],
        )

    def fault(self, rows: Ints, values: Mapping[str, Value]) -> Fault:
        return _fault(self, rows, values)


def _fault(source: Block | Aside, rows: Ints, values: Mapping[str, Value]) -> Fault:
    """A fault in these rows of the file."""
    rows = np.atleast_1d(rows)
    return Fault(
        column=source.column,
        file=source.file,
        row=int(rows.min()),
        last_row=int(rows.max()),
        rows=rows.size,
        values=values,
    )


def ordered(cells: Cells, sound: Flags) -> Ordered:
    """Rows with a place and an age; `sound` are the rows whose every label could be read."""
    take = np.flatnonzero(sound & (cells.start >= 0))
    place, start = cells.place[take], cells.start[take]
    key = place * 256 + start
    if np.any(key[1:] < key[:-1]):
        order = np.argsort(key, kind="stable")
        take, place, start = take[order], place[order], start[order]
    change = place[1:] != place[:-1]
    last = np.append(change, True)[: len(take)]
    opened, stated = cells.open[take], cells.stated[take]
    if cells.sheet.mapping.last_age_open:
        opened = opened | (last & stated & (cells.end[take] < 0))
    unread = cells.placed & ~sound
    lost = np.cumsum(~cells.placed)[take]  # rows of unknown place up to this one
    ahead = np.append(lost, np.count_nonzero(~cells.placed))
    return Ordered(
        cells=cells,
        take=take,
        place=place,
        start=start,
        end=cells.end[take],
        open=opened,
        stated=stated,
        first=np.append(True, change)[: len(take)],
        last=last,
        broken=np.isin(place, cells.place[unread]) if unread.any() else np.zeros(len(take), bool),
        parted=ahead[1:] != lost,
        parted_before=lost != np.append(0, lost)[:-1],
    )


def blocks(rows: Ordered, spoiled: Ints) -> Iterator[Block]:
    """Vectors of all places that are stated and not spoiled, a block for each measure and grid."""
    kept: Flags | slice = slice(None)
    if len(spoiled) or not rows.stated.all():
        kept = rows.stated & ~np.isin(rows.place, spoiled)
    take, place, start = rows.take[kept], rows.place[kept], rows.start[kept]
    if not len(take):
        return
    sheet, begins = rows.cells.sheet, np.flatnonzero(rows.first[kept])
    rule = Rule.of(sheet.mapping)
    for starts, lines in _grids(start, begins):
        cell = begins[lines][:, None] + np.arange(len(starts))
        taken = take[cell]
        provisional = (rows.cells.status[taken] == 1).any(axis=-1)
        for field, numbers in sheet.numbers.items():
            yield Block(
                measure=MEASURES[field],
                file=sheet.name,
                column=sheet.mapping.column(field),
                grid=AgeGrid(starts),
                place=place[begins[lines]],
                provisional=provisional,
                values=_rounded(numbers.values[taken], field),
                row=sheet.row[taken],
                rule=rule,
            )


def groups(rows: Ordered, spoiled: Ints) -> Iterator[Aside]:
    """The numbers of places that are not stated, those of one age group together."""
    kept = ~rows.stated & ~np.isin(rows.place, spoiled)
    take = rows.take[kept]
    last = np.where(rows.open[kept], OLDEST, np.maximum(rows.end[kept], rows.start[kept]))
    ages = rows.start[kept] * (OLDEST + 1) + last
    for one in np.unique(ages).tolist():
        yield from asides(rows.cells, take[ages == one], divmod(one, OLDEST + 1))


def _rounded(values: Array, field: str) -> Array:
    return values if field == RATE else np.round(values, DECIMALS) + 0.0


def asides(
    cells: Cells, rows: Flags | Ints, ages: tuple[int, int] | None = (0, OLDEST)
) -> Iterator[Aside]:
    """The numbers of some rows, in the order of their places, and which ages they are of."""
    take = np.flatnonzero(rows) if rows.dtype == bool else np.asarray(rows, np.int64)
    if not len(take):
        return
    sheet, place = cells.sheet, place_of(cells.area[take], cells.sex[take], cells.year[take])
    order = np.argsort(place, kind="stable")
    take, place = take[order], place[order]
    for field, numbers in sheet.numbers.items():
        yield Aside(
            measure=MEASURES[field],
            file=sheet.name,
            column=sheet.mapping.column(field),
            place=place,
            provisional=cells.status[take] == 1,
            values=np.round(numbers.values[take], DECIMALS) + 0.0,
            row=sheet.row[take],
            rule=Rule.of(sheet.mapping),
            ages=ages,
        )


def _grids(start: Ints, begins: Ints) -> Iterator[tuple[tuple[int, ...], Ints]]:
    """Each grid found, with the lines that have it: told apart by a sum of weights, then proved."""
    weights = np.random.default_rng(0).integers(1, 2**62, 256)
    lengths = np.diff(np.append(begins, len(start)))
    marks = np.add.reduceat(weights[start], begins) * 1024 + lengths
    _, first, which = np.unique(marks, return_index=True, return_inverse=True)
    for number in np.argsort(first):
        lines = np.flatnonzero(which == number)
        starts = start[begins[lines[0]] : begins[lines[0]] + lengths[lines[0]]]
        alike = start[begins[lines][:, None] + np.arange(len(starts))] == starts
        if not alike.all():
            raise AssertionError("two grids have the same mark")
        yield tuple(starts.tolist()), lines
