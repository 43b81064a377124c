"""A table as it is printed: heads, texts and marks, so that a template only places them.

Limits of an interval, in columns `under` another, stand on a second line under its number; columns
that share a `span` stand under one head.
"""

from dataclasses import dataclass, replace
from itertools import groupby

from server.exports.table import Cell, Column, Gap, GapKind, Row, Table
from server.sentences.numbers import MINUS, interval, number
from server.sentences.text import _


@dataclass(frozen=True, slots=True)
class Head:
    label: str
    unit: str = ""
    columns: int = 1  # it stands over
    rows: int = 1  # it reaches down
    numeric: bool = True


@dataclass(frozen=True, slots=True)
class Printed:
    """One cell: a text, or the gap that stands for it; and the line under it, likewise."""

    label: str  # of its column, for narrow screens
    numeric: bool
    text: str = ""
    gap: Gap | None = None
    under: str = ""
    under_gap: Gap | None = None
    provisional: bool = False

    @property
    def empty(self) -> bool:
        """Whether there is nothing to be read in it."""
        return not (self.text or self.gap or self.under or self.under_gap)


@dataclass(frozen=True, slots=True)
class PrintedRow:
    cells: tuple[Printed, ...]
    second: str
    href: str


@dataclass(frozen=True, slots=True)
class PrintedTable:
    key: str
    title: str
    note: str
    heads: tuple[tuple[Head, ...], ...]  # one line, or two where heads are shared
    rows: tuple[PrintedRow, ...]
    total: PrintedRow | None
    gaps: tuple[GapKind, ...]  # the marks its key must explain, in the order of GapKind
    provisional: bool
    widest: int  # columns


def printed(table: Table) -> PrintedTable:
    """The table in print.

    Raises: ValueError where a number's column has no `decimals` and it is not a whole one, or more
    or fewer than two limits are set under one column.
    """
    shown = [index for index, column in enumerate(table.columns) if not column.under]
    limits = {index: _limits(table, table.columns[index].key) for index in shown}
    rows = tuple(_row(table, row, limits) for row in table.rows)
    total = _row(table, table.total, limits) if table.total else None
    cells = [cell for row in (*rows, *([total] if total else [])) for cell in row.cells]
    kinds = {gap.kind for cell in cells for gap in (cell.gap, cell.under_gap) if gap}
    return PrintedTable(
        key=table.key,
        title=table.title,
        note=table.note,
        heads=_heads([table.columns[index] for index in shown]),
        rows=rows,
        total=total,
        gaps=tuple(kind for kind in GapKind if kind in kinds),
        provisional=any(cell.provisional for cell in cells),
        widest=len(shown),
    )


def _limits(table: Table, key: str) -> tuple[int, int] | None:
    found = [index for index, column in enumerate(table.columns) if column.under == key]
    if not found:
        return None
    if len(found) != 2:
        raise ValueError(f"table {table.key}: {len(found)} limits under {key}; expected low, high")
    return found[0], found[1]


def _heads(columns: list[Column]) -> tuple[tuple[Head, ...], ...]:
    if not any(column.span for column in columns):
        return (tuple(_head(column, 1) for column in columns),)
    top: list[Head] = []
    below: list[Head] = []
    for span, group in groupby(columns, key=lambda column: column.span):
        members = list(group)
        if span:
            top.append(Head(span, columns=len(members)))
            below += [_head(column, 1) for column in members]
        else:
            top += [_head(column, 2) for column in members]
    return tuple(top), tuple(below)


def _head(column: Column, rows: int) -> Head:
    return Head(column.label, column.unit, rows=rows, numeric=column.decimals is not None)


def _row(table: Table, row: Row, limits: dict[int, tuple[int, int] | None]) -> PrintedRow:
    first, *others = (_cell(table, row, index, pair) for index, pair in limits.items())
    if row.shown:
        first = replace(first, text=row.shown)
    return PrintedRow((first, *others), row.second, row.href)


def _cell(table: Table, row: Row, index: int, pair: tuple[int, int] | None) -> Printed:
    column, value = table.columns[index], row.cells[index]
    numeric = column.decimals is not None
    if numeric and row.decimals is not None:
        column = replace(column, decimals=row.decimals)
    label = f"{column.span}, {column.label}" if column.span else column.label
    if isinstance(value, Gap):
        return Printed(label, numeric, gap=value)
    text = _text(table, column, value)
    provisional = row.provisional and numeric and not isinstance(value, str)
    if pair is None:
        return Printed(label, numeric, text, provisional=provisional)
    low, high = (row.cells[at] for at in pair)
    if isinstance(low, Gap) or isinstance(high, Gap):
        gap = low if isinstance(low, Gap) else high
        assert isinstance(gap, Gap)
        return Printed(label, numeric, text, under_gap=gap, provisional=provisional)
    under = _under(column, low, high)
    return Printed(label, numeric, text, under=under, provisional=provisional)


def _under(column: Column, low: Cell, high: Cell) -> str:
    if isinstance(low, int | float) and isinstance(high, int | float):
        return interval(low, high, column.decimals or 0, signed=column.signed)
    return _("{low} to {high}", low=low, high=high) if low or high else ""


def _text(table: Table, column: Column, value: str | int | float) -> str:
    if isinstance(value, str):
        return value
    if column.decimals is not None:
        return number(value, column.decimals, signed=column.signed)
    if isinstance(value, int):
        return str(value).replace("-", MINUS)  # a name made of digits: a year, an edition
    raise ValueError(f"table {table.key}, column {column.key}: {value!r} needs `decimals`")
