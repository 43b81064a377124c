"""Rows by cause made one row for each area, sex, year and age, with its deaths by cause beside it.

Where a sum is delivered beside its parts (all causes, a group, a range of codes), it is taken as
the sum, and compared; where it is not, its parts are summed. Deaths of all causes beyond those of
the leaves of the list stay without a cause.
"""

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from engine.ages import Array
from server.intake.causes.items import ALL, Items
from server.intake.cells import TOTAL, UNREADABLE, Cells, Flags, Ints
from server.intake.schedules import DECIMALS
from server.intake.sheets import Labels, Numbers

CLOSE = 0.5 * 10.0**-DECIMALS  # counts are the same where they differ by less
_AGES = 256  # ages and their signs lie below


@dataclass(frozen=True, slots=True)
class Rows:
    """The rows of a file by cause, before they are put together. All arrays are [row]."""

    cells: Cells
    items: Items
    item: Ints  # UNREADABLE where the cause cannot be read
    cell: Ints  # rows of one area, sex, year and age share it; in the order of their first rows
    head: Ints  # [cell], first row of each


@dataclass(frozen=True, slots=True)
class Sums:
    """Sums that were delivered beside their parts, where they differ: [difference]."""

    cell: Ints
    item: Ints
    row: Ints  # of the sum, in the file
    given: Array
    parts: Array


@dataclass(frozen=True, slots=True)
class ByCause:
    """Deaths of one file by leaves of its list."""

    items: Items
    cells: Cells  # one row each, of all causes
    cell: Ints  # [count]
    leaf: Ints  # [count], number in the list
    deaths: Array  # [count]
    rest: Array  # [cell], deaths of all causes without those of the leaves
    sums: Sums
    summed: Ints  # codes beside longer ones that are their sums
    apart: Ints  # and those that are not, and count beside them
    texts: tuple[str, ...]  # distinct texts of the column of causes

    @property
    def file(self) -> str:
        return self.cells.sheet.name

    @property
    def column(self) -> str:
        """Of the causes."""
        return self.cells.sheet.mapping.cause or self.deaths_column

    @property
    def deaths_column(self) -> str:
        return self.cells.sheet.mapping.column("deaths")

    @property
    def all_causes(self) -> Array:
        """Deaths, [cell]."""
        return self.cells.sheet.numbers["deaths"].values

    @property
    def at_ages(self) -> Flags:
        """Cells that are no totals over the ages."""
        return np.asarray(self.cells.start != TOTAL)

    @property
    def row(self) -> Ints:
        """Row in the file that stands for each cell, rising, [cell]."""
        return self.cells.sheet.row

    def of(self, leaf: int) -> Array:
        """Deaths of a leaf, [cell]; all others for -1."""
        if leaf < 0:
            return self.rest
        found = np.zeros(len(self.row))
        mine = self.leaf == leaf
        found[self.cell[mine]] = self.deaths[mine]
        return found

    @property
    def leaves(self) -> list[int]:
        """Those that have deaths."""
        found: list[int] = np.unique(self.leaf[self.deaths > 0]).tolist()
        return found


def rows_of(cells: Cells, items: Items) -> Rows:
    """Which rows belong together, and people filled in where only one of the rows has them."""
    cell, head = _together(cells)
    item = items.of_text[cells.sheet.labels["cause"].codes]
    sheet = cells.sheet
    filled = {
        field: numbers if field == "deaths" else _filled(numbers, cell, len(head))
        for field, numbers in sheet.numbers.items()
    }
    return Rows(replace(cells, sheet=replace(sheet, numbers=filled)), items, item, cell, head)


def _together(cells: Cells) -> tuple[Ints, Ints]:
    """The cell of each row, and the first row of each cell. A row whose labels cannot be read is
    alone."""
    ages = (cells.start + 4) * _AGES + cells.end + 1
    key = (cells.place * _AGES * _AGES + ages) * 2 + cells.open
    alone = ~cells.placed | (cells.start == UNREADABLE)
    key = np.where(alone, -1 - np.arange(len(key)), key)
    _, first, which = np.unique(key, return_index=True, return_inverse=True)
    order = np.argsort(first)
    rank = np.empty_like(order)
    rank[order] = np.arange(len(order))
    return rank[which], first[order]


def _filled(numbers: Numbers, cell: Ints, cells: int) -> Numbers:
    """With blanks filled from another row of the same cell."""
    blank = np.isnan(numbers.values) if numbers.texts is None else numbers.texts.codes < 0
    source = np.full(cells, UNREADABLE)
    known = np.flatnonzero(~blank)[::-1]
    source[cell[known]] = known
    take = np.where(blank & (source[cell] >= 0), source[cell], np.arange(len(cell)))
    texts = numbers.texts and Labels(numbers.texts.codes[take], numbers.texts.texts)
    return Numbers(numbers.values[take], texts, numbers.unit)


def put_together(rows: Rows) -> tuple[Cells, ByCause]:
    """One row for each cell, with the deaths of all causes, and the deaths by cause."""
    head, sheet = rows.head, rows.cells.sheet
    known = np.flatnonzero((rows.item >= 0) & np.isfinite(sheet.numbers["deaths"].values))
    items, summed, apart = _longer(rows, known)
    rows = replace(rows, items=items)
    entry, sums = _summed_up(rows, known)
    total = np.zeros(len(head))
    at_top = entry.item == ALL
    total[entry.cell[at_top]] = entry.value[at_top]
    own = items.is_leaf[entry.item]
    cell, leaf = entry.cell[own], items.leaf[entry.item[own]]
    deaths = np.round(entry.value[own], DECIMALS)
    of_leaves = np.round(np.bincount(cell, deaths, len(head)), DECIMALS)
    total = np.where(total < of_leaves, of_leaves, np.round(total, DECIMALS))
    together = _one_each(rows, total)
    by_cause = ByCause(
        items=items,
        cells=together,
        cell=cell,
        leaf=leaf,
        deaths=deaths,
        rest=np.round(total - of_leaves, DECIMALS),
        sums=sums,
        summed=summed,
        apart=apart,
        texts=sheet.labels["cause"].texts,
    )
    return together, by_cause


def _one_each(rows: Rows, total: Array) -> Cells:
    """The first row of each cell, with the deaths of all causes."""
    cells, head = rows.cells, rows.head
    sheet = cells.sheet
    numbers = {
        field: Numbers(total, None, found.unit)
        if field == "deaths"
        else Numbers(
            found.values[head],
            found.texts and Labels(found.texts.codes[head], found.texts.texts),
            found.unit,
        )
        for field, found in sheet.numbers.items()
    }
    labels = {
        field: Labels(found.codes[head], found.texts)
        for field, found in sheet.labels.items()
        if field != "cause"
    }
    status = np.zeros(len(head), np.int64)
    np.maximum.at(status, rows.cell, cells.status)
    return replace(
        cells,
        sheet=replace(sheet, row=sheet.row[head], labels=labels, numbers=numbers),
        area=cells.area[head],
        sex=cells.sex[head],
        year=cells.year[head],
        start=cells.start[head],
        end=cells.end[head],
        open=cells.open[head],
        status=status,
    )


@dataclass(frozen=True, slots=True)
class _Values:
    """One value for each cell and item: [value], by cell."""

    cell: Ints
    item: Ints
    value: Array


def _longer(rows: Rows, known: Ints) -> tuple[Items, Ints, Ints]:
    """Single codes beside longer ones that begin with them (I21 beside I21.9): a sum, where it is
    that of the longer ones wherever it stands; else a cause of its own."""
    items = rows.items
    depth, item = items.depth, rows.item
    none = np.zeros(0, np.int64)
    shorter = np.unique(items.parent[item[known]])
    shorter = shorter[shorter >= 0]
    shorter = shorter[items.single[shorter] & np.isin(shorter, item[known])]
    if not len(shorter):
        return items, none, none
    deaths, size = rows.cells.sheet.numbers["deaths"].values, len(items)
    own = known[np.isin(item[known], shorter)]
    under = known[np.isin(items.parent[item[known]], shorter)]
    key, parts = _added(rows.cell[under] * size + items.parent[item[under]], deaths[under])
    at, whole = _added(rows.cell[own] * size + item[own], deaths[own])
    beside = _found(key, parts, at)
    other = np.unique(at[~(np.abs(whole - beside) < CLOSE)] % size)
    apart = np.zeros(size, bool)
    apart[other] = True
    deepest_first = shorter[np.argsort(-depth[shorter])]
    return items.apart(apart), np.setdiff1d(deepest_first, other), other


def _summed_up(rows: Rows, known: Ints) -> tuple[_Values, Sums]:
    """The value of every item that has one, from the deepest to all causes, and the sums that
    differ from their parts."""
    items, size = rows.items, len(rows.items)
    deaths = rows.cells.sheet.numbers["deaths"].values
    depth = items.depth
    at, given = _added(rows.cell[known] * size + rows.item[known], deaths[known])
    level = depth[at % size]
    keys, values = np.zeros(0, np.int64), np.zeros(0)
    kept: list[tuple[Ints, Array]] = []
    differing: list[tuple[Ints, Array, Array]] = []
    for step in range(int(depth.max(initial=0)), -1, -1):
        here = level == step
        parts = _found(keys, values, at[here])
        if step == 0:
            parts = np.nan_to_num(parts)
        differs = np.abs(given[here] - parts) >= CLOSE
        differing.append((at[here][differs], given[here][differs], parts[differs]))
        own = ~np.isin(keys, at[here])
        keys, values = _added(np.append(keys[own], at[here]), np.append(values[own], given[here]))
        kept.append((keys, values))
        keys, values = _added(keys - keys % size + items.parent[keys % size], values)
    key, value = (np.concatenate(part) for part in zip(*kept, strict=True))
    differing += _beside(rows, known, key, value, at, given)
    sums = tuple(np.concatenate(part) for part in zip(*differing, strict=True))
    return _Values(key // size, key % size, value), _sums(rows, known, *sums)


def _beside(
    rows: Rows, known: Ints, key: Ints, value: Array, at: Ints, given: Array
) -> Iterator[tuple[Ints, Array, Array]]:
    """Ranges of several causes that differ from the sum of what they hold."""
    items, size = rows.items, len(rows.items)
    found = np.unique(rows.item[known])
    for one in found[items.beside[found]].tolist():
        members = items.members(one, found)
        if not members.size:
            continue
        inside = np.isin(key % size, members)
        cells, parts = _added(key[inside] // size, value[inside])
        own = at % size == one
        beside = np.nan_to_num(_found(cells, parts, at[own] // size))
        differs = np.abs(given[own] - beside) >= CLOSE
        yield at[own][differs], given[own][differs], beside[differs]


def _sums(rows: Rows, known: Ints, key: Ints, given: Array, parts: Array) -> Sums:
    size = len(rows.items)
    where = rows.cell[known] * size + rows.item[known]
    order = np.argsort(where, kind="stable")
    row = known[order[np.searchsorted(where[order], key)]] if len(key) else key
    return Sums(key // size, key % size, rows.cells.sheet.row[row], given, parts)


def _added(keys: Ints, values: Array) -> tuple[Ints, Array]:
    """Each key once, with the sum of its values."""
    once, which = np.unique(keys, return_inverse=True)
    return once, np.bincount(which, values, len(once)).astype(np.float64)


def _found(keys: Ints, values: Array, wanted: Ints) -> Array:
    """The values of some keys, nan where there are none. `keys` rise."""
    if not len(keys):
        return np.full(len(wanted), np.nan)
    at = np.minimum(np.searchsorted(keys, wanted), len(keys) - 1)
    return np.where(keys[at] == wanted, values[at], np.nan)
