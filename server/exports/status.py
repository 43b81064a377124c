"""Marks of the open SDMX code lists: CL_OBS_STATUS (version 2.2) of a number or a gap, and
CL_CONF_STATUS of what is withheld.

An observation has one mark; of several that are true the first in PRECEDENCE is given. The list has
none for a revised number, which has a column of our own.
"""

from server.exports.table import Column, Gap, GapKind, Row, Table

NORMAL = "A"
BREAK = "B"  # time series break: the first year of another kind
ESTIMATED = "E"  # it rests on counts that were shared out, or on stand-ins for withheld ones
PROVISIONAL = "P"
PRECEDENCE = (BREAK, ESTIMATED, PROVISIONAL, NORMAL)

OF_GAPS = {
    GapKind.WITHHELD: "Q",  # missing value; suppressed
    GapKind.NIL: NORMAL,  # nobody was counted: that is known
    GapKind.NOT_AVAILABLE: "O",  # missing value: nothing was delivered
    GapKind.UNDEFINED: "M",  # missing value; data cannot exist
}
CONFIDENTIAL, FREE = "C", "F"


def observed(table: Table) -> tuple[int, ...]:
    """Columns that hold observations: numbers, but for the first, which names the row, and limits,
    which share the mark of their number."""
    return tuple(
        at
        for at, column in enumerate(table.columns)
        if at and column.decimals is not None and not column.under
    )


def of_row(row: Row) -> str:
    """The mark of a row's numbers: where its cells have marks of their own, that of most."""
    if row.marks:
        return max(PRECEDENCE, key=row.marks.count)
    if row.estimated:
        return ESTIMATED
    return PROVISIONAL if row.provisional else NORMAL


def of_cell(row: Row, at: int, column: Column) -> str:
    """The mark of one observation; empty where there is neither a number nor a gap."""
    cell = row.cells[at]
    if isinstance(cell, Gap):
        return OF_GAPS[cell.kind]
    if isinstance(cell, str):
        return ""
    if row.marks and row.marks[at]:
        return row.marks[at]
    return of_row(row)


def first_of(*marks: str) -> str:
    """The one to give of several that are true of one number.

    >>> first_of("P", "A", "E")
    'E'
    """
    return min((mark for mark in marks if mark), key=PRECEDENCE.index, default=NORMAL)


def withheld(row: Row, at: int) -> bool:
    cell = row.cells[at]
    return isinstance(cell, Gap) and cell.kind is GapKind.WITHHELD
