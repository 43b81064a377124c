"""Where the headings of a table stand: below titles and notes, in one row or several."""

from collections.abc import Sequence
from dataclasses import dataclass
from statistics import median

from server.intake.labels import read_year
from server.intake.lists import role_of
from server.intake.mapping import COLUMNS
from server.intake.recognising.across import meanings
from server.intake.recognising.marks import is_number
from server.intake.recognising.names import is_count, is_rate, named, suggests

DEEPEST = 40  # rows among which the headings are looked for
MOST_ROWS = 3  # of headings, one above the other
FILLED = 0.6  # of the columns that a row of headings names, at least

Rows = Sequence[tuple[str, ...]]


@dataclass(frozen=True, slots=True)
class Heading:
    """Row of the file in which the headings begin, 1 for the first, and how many rows they take."""

    first: int
    rows: int
    sure: bool


def heading(rows: Rows) -> Heading:
    """The row that calls most columns by their usual names, of several the first; else the first
    row that names most of the columns; with the rows of headings beside it.

    A heading names things that the rows below it do not repeat, so a row that could as well be one
    of counts is none, unless it is of years or ages.
    """
    cells = [tuple(cell.strip() for cell in row) for row in rows]
    at = _most_usual(cells)
    if at is None:
        at = next((at for at in range(min(len(cells), DEEPEST)) if _heads(cells, at)), None)
    if at is None:
        return Heading(1, 1, sure=False)
    if role_of(filter(None, cells[at])):  # names and years below could go on with the headings
        return Heading(at + 1, 1, sure=True)
    first, last = _upwards(cells, at), _downwards(cells, at)
    return Heading(first + 1, last - first + 1, sure=_sure(cells, at))


def _most_usual(cells: Rows) -> int | None:
    """The row with most usual names of columns; None where none has two."""
    usual = [
        len({cell for cell in row if cell and named(cell, COLUMNS)}) for row in cells[:DEEPEST]
    ]
    most = max(usual, default=0)
    return usual.index(most) if most > 1 else None


def _heads(cells: Rows, at: int) -> bool:
    """Whether a row is filled as widely as those below it, and could be of headings."""
    widths = [sum(1 for cell in row if cell) for row in cells[at:]]
    below = [width for width in widths[1:] if width > 1][:20]
    wide = widths[0] > 1 and not (below and widths[0] < FILLED * median(below))
    return wide and _names(cells[at])


def _named(cell: str) -> bool:
    """Whether a cell is the name of a column."""
    return bool(named(cell, COLUMNS) or is_count(cell) or is_rate(cell) or suggests(cell, COLUMNS))


def _names(row: tuple[str, ...]) -> bool:
    """Whether a row could be of headings: it names a column, or holds no number at all."""
    filled = [cell for cell in row if cell]
    if any(_named(cell) for cell in filled):
        return True
    return not any(is_number(cell) for cell in filled)


def _sure(cells: Rows, at: int) -> bool:
    """Whether a column is called by its usual name, and the row below is of counts."""
    below = next((row for row in cells[at + 1 :] if sum(map(bool, row)) > 1), ())
    return any(named(cell, COLUMNS) for cell in cells[at]) and any(map(is_number, below))


def _upwards(cells: Rows, at: int) -> int:
    """First row of the headings: rows just above hold ages, sexes, years or counts over several
    columns."""
    first = at
    while first > 0 and at - first + 1 < MOST_ROWS and _spans(cells[first - 1]):
        first -= 1
    return first


def _downwards(cells: Rows, at: int) -> int:
    """Last row of the headings: rows just below that go on with names and hold no count."""
    last = at
    while last + 1 < len(cells) and last - at + 1 < MOST_ROWS and _goes_on(cells, at, last + 1):
        last += 1
    return last


def _spans(row: tuple[str, ...]) -> bool:
    filled = [cell for cell in row if cell]
    return len(filled) > 1 and all(_says(cell) for cell in filled)


def _goes_on(cells: Rows, at: int, row: int) -> bool:
    """A row of counts could look like one of ages; then these must be those that follow on 0."""
    filled = [cell for cell in cells[row] if cell]
    digits = [int(cell) for cell in filled if cell.isdecimal() and not read_year(cell)]
    first = cells[row][0]
    below = not first or named(first, COLUMNS)
    return bool(below) and _spans(cells[row]) and digits == list(range(len(digits)))


def _says(cell: str) -> bool:
    """Whether a cell is an age, a sex, a year, a count or the name of a column."""
    if is_number(cell) and not read_year(cell) and len(cell) > 3:
        return False
    return _named(cell) or any(True for _ in meanings(cell))
