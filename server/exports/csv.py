"""One table as CSV: RFC 4180, UTF-8, CRLF, one heading row of column keys, numbers in full.

A *text* that a spreadsheet would take for a formula gets an apostrophe before it.
"""

import csv
import io

from server.exports.flat import Plain, flat
from server.exports.table import Table

MEDIA_TYPE = "text/csv; charset=utf-8"
_FORMULA = ("=", "+", "-", "@", "\t", "\r", "\n")


def write(table: Table) -> bytes:
    """The file's bytes."""
    form = flat(table)
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\r\n")
    writer.writerow(form.headings)
    writer.writerows([_written(cell) for cell in row] for row in form.rows)
    return out.getvalue().encode()


def _written(cell: Plain) -> str:
    if cell is None:
        return ""
    if isinstance(cell, str):
        return f"'{cell}" if cell.startswith(_FORMULA) else cell
    return repr(cell)
