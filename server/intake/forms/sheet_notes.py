"""What is said of the cells of a sheet: formulas, hidden and merged ones."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from server.intake.forms.found import Found
from server.intake.forms.sheet_rows import BETWEEN, Merged, SheetRows, letters, place
from server.intake.problems import Fault, Text

MOST_FILLED = 1_000_000  # cells of merged ranges


@dataclass(frozen=True, slots=True)
class Filled:
    """A table whose merged cells hold their text in each of their rows."""

    body: bytes
    ranges: tuple[Merged, ...]  # that were filled
    found: tuple[Found, ...] = ()


def told(cells: SheetRows, heading: int) -> Iterator[Found]:
    """Of the rows from the heading on."""
    if cells.formulas:
        yield Found("formulas_kept", Fault(values={"count": cells.formulas}))
    for cell in cells.valueless:
        row = place(cell)[0]
        if row >= heading:
            yield Found("formula_without_value", Fault(row=row, values={"cell": cell}))
    if rows := [row for row in cells.hidden if row >= heading]:
        values = {"what": Text("hidden rows")}
        fault = Fault(row=rows[0], last_row=rows[-1], rows=len(rows), values=values)
        yield Found("hidden_cells", fault)
    if columns := [letters(column) for column in cells.hidden_columns if column <= cells.width]:
        values = {"what": Text("hidden columns: {columns}", columns=", ".join(columns))}
        yield Found("hidden_cells", Fault(values=values))


def filled_down(body: bytes, merged: Sequence[Merged], first: int) -> Filled:
    """Cells merged over several rows below the heading (`first` is the row after it), made to hold
    their text in each of these rows."""
    rows = body.split(b"\n")
    last = first + len(rows) - 1
    ranges = [one for one in merged if one.row >= first and one.row < min(one.last_row, last)]
    if not ranges:
        return Filled(body, ())
    if sum(min(one.last_row, last) - one.row for one in ranges) > MOST_FILLED:
        fault = Fault(row=ranges[0].row, values={"count": len(ranges), "most": MOST_FILLED})
        return Filled(body, (), (Found("too_many_merged", fault),))
    between = BETWEEN.encode()
    for one in ranges:
        cells = rows[one.row - first].split(between)
        text = cells[one.column - 1] if one.column <= len(cells) else b""
        for row in range(one.row + 1 - first, min(one.last_row, last) + 1 - first):
            under = rows[row].split(between)
            if text and one.column <= len(under):
                under[one.column - 1] = text
                rows[row] = between.join(under)
    cells_at = f"{letters(ranges[0].column)}{ranges[0].row}"
    fault = Fault(
        row=ranges[0].row,
        last_row=ranges[-1].row,
        rows=len(ranges),
        values={"count": len(ranges), "cell": cells_at},
    )
    return Filled(b"\n".join(rows), tuple(ranges), (Found("merged_filled", fault),))
