"""A table as plain rows of numbers and texts, the form CSV and XLSX share.

A gap leaves its cell empty and says its kind in a column of its own, `<key>_missing`; a second line
under a first cell becomes `remark`; `provisional` is "yes" where a row's numbers are. These columns
are there only where the table has something to put into them. `obs_status` is the mark of a row's
numbers in the SDMX code list (server/exports/status.py); where a column has another in some row,
`<key>_obs_status` gives all of its own, and `<key>_conf_status` says what is confidential. A sum is
the last row. Names behind codes are left out: they may change under an address.
"""

import math
from collections.abc import Iterator
from dataclasses import dataclass

from server.exports import status
from server.exports.table import Cell, Column, Gap, Row, Table

Plain = str | int | float | None


@dataclass(frozen=True, slots=True)
class Flat:
    headings: tuple[str, ...]
    rows: tuple[tuple[Plain, ...], ...]


def flat(table: Table) -> Flat:
    """The table's cells and companions.

    Raises: ValueError where a row has more or fewer cells than there are columns, or a number is
    not finite.
    """
    rows = all_rows(table)
    headings, parts = [], []
    seen = status.observed(table)
    for index, column in enumerate(table.columns):
        cells = [row.cells[index] for row in rows]
        headings.append(column.key)
        parts.append([plain(cell, table, column) for cell in cells])
        if any(isinstance(cell, Gap) for cell in cells):
            headings.append(f"{column.key}_missing")
            parts.append([cell.kind.value if isinstance(cell, Gap) else None for cell in cells])
        if index in seen:
            for heading, marks in _marks(rows, index, column):
                headings.append(heading)
                parts.append(marks)
    if any(row.second for row in rows):
        headings.append("remark")
        parts.append([row.second for row in rows])
    if any(row.provisional for row in rows):
        headings.append("provisional")
        parts.append(["yes" if row.provisional else None for row in rows])
    if any(row.revised for row in rows):
        headings.append("revised")
        parts.append(["yes" if row.revised else None for row in rows])
    if seen:
        headings.append("obs_status")
        parts.append([status.of_row(row) for row in rows])
    return Flat(tuple(headings), tuple(zip(*parts, strict=True)))


def _marks(rows: tuple[Row, ...], index: int, column: Column) -> Iterator[tuple[str, list[Plain]]]:
    """The marks of a column that are not those of its rows, and what of it is confidential."""
    own = [status.of_cell(row, index, column) for row in rows]
    if any(mark and mark != status.of_row(row) for mark, row in zip(own, rows, strict=True)):
        yield f"{column.key}_obs_status", [mark or None for mark in own]
    gone = [status.withheld(row, index) for row in rows]
    if any(gone):
        yield (
            f"{column.key}_conf_status",
            [status.CONFIDENTIAL if one else status.FREE for one in gone],
        )


def all_rows(table: Table) -> tuple[Row, ...]:
    """The rows and the sum, each with one cell a column."""
    rows = (*table.rows, table.total) if table.total else table.rows
    for number, row in enumerate(rows, start=1):
        if len(row.cells) != len(table.columns):
            raise ValueError(
                f"row {number} of table {table.key} has {len(row.cells)} cells; "
                f"it has {len(table.columns)} columns"
            )
    return rows


def plain(cell: Cell, table: Table, column: Column) -> Plain:
    """A number as it is, in Python's own type; None for a gap, or where a sum has no number."""
    if isinstance(cell, Gap):
        return None
    if isinstance(cell, str):
        return cell or (None if column.decimals is not None else "")
    if not math.isfinite(cell):
        raise ValueError(
            f"table {table.key}, column {column.key}: found {cell!r}; expected a number or a Gap "
            "that says why there is none"
        )
    return float(cell) if isinstance(cell, float) else int(cell)
