"""Tables on a terminal: in columns, or as the same CSV and JSON the pages' twins give."""

import argparse

from server.exports import csv, json
from server.exports.table import Gap, Table
from server.exports.twin import Twin
from server.pages.printed import Printed, PrintedTable, printed
from server.sentences.text import _

FORMS = ("table", "csv", "json")


def add_form(command: argparse.ArgumentParser) -> None:
    command.add_argument(
        "--as", dest="form", choices=FORMS, default="table", help=_("how to print it")
    )


def show(twin: Twin, form: str) -> None:
    """Print the first table of a twin; JSON holds all of it."""
    if form == "table":
        print(in_columns(twin.tables[0]))
    elif form == "csv":
        print(csv.write(twin.tables[0]).decode().replace("\r\n", "\n"), end="")
    else:
        print(json.write(twin).decode(), end="")


def in_columns(table: Table) -> str:
    """The table in columns set with spaces, numbers to the right, and why numbers are missing."""
    shown = printed(table)
    heads = [head.label for head in shown.heads[-1]]
    rows = [[_text(cell) for cell in row.cells] for row in shown.rows]
    widths = [max(map(len, column)) for column in zip(heads, *rows, strict=True)]
    right = [head.numeric for head in shown.heads[-1]]
    lines = [
        "  ".join(
            text.rjust(width) if numeric else text.ljust(width)
            for text, width, numeric in zip(row, widths, right, strict=True)
        ).rstrip()
        for row in (heads, *rows)
    ]
    return "\n".join([*lines, *_notes(shown, table)])


def _text(cell: Printed) -> str:
    if cell.gap is not None:
        return _(cell.gap.kind.value)
    mark = " " + _("p") if cell.provisional else ""
    if cell.under_gap is not None:
        return f"{cell.text}{mark} ({_(cell.under_gap.kind.value)})"
    return f"{cell.text}{mark}" + (f" ({cell.under})" if cell.under else "")


def _notes(shown: PrintedTable, table: Table) -> list[str]:
    """What marks mean and why numbers are missing, each reason once."""
    cells = [cell for row in table.rows for cell in row.cells]
    gaps = dict.fromkeys(cell for cell in cells if isinstance(cell, Gap) and cell.reason)
    notes = [_("p: provisional")] if shown.provisional else []
    notes += [f"{_(gap.kind.value)}: {gap.reason}" for gap in gaps]
    return [*([""] if notes else []), *notes]
