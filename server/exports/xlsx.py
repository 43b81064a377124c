"""A page as a workbook: a sheet that says what it is, then one sheet a table.

Texts are typed as texts, so none becomes a formula; equal content gives equal bytes, since no time
of writing is kept.
"""

import datetime as dt
import io
import re
import zipfile
from collections.abc import Iterable

from openpyxl import Workbook
from openpyxl.cell.cell import Cell
from openpyxl.styles import Alignment, Font
from openpyxl.worksheet.worksheet import Worksheet

from server.exports.flat import Plain, flat, plain
from server.exports.twin import Twin

MEDIA_TYPE = "application/vnd.openxmlformats-officedocument.spreadsheetml.sheet"
ABOUT = "about"
_NO_TIME = dt.datetime(1980, 1, 1)  # the first moment a zip archive knows
_CONTROL = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f\ufffe\uffff]")  # not allowed in XML
_MODIFIED = re.compile(rb"(<dcterms:modified[^>]*>)[^<]*(</dcterms:modified>)")


def write(twin: Twin) -> bytes:
    """The file's bytes."""
    book = Workbook()
    book.properties.created = _NO_TIME
    book.properties.creator = "Ebbline"
    about = book.active
    about.title = ABOUT
    _fill(about, _about(twin), bold=0)
    for table in twin.tables:
        form = flat(table)
        sheet = book.create_sheet(table.key)
        _fill(sheet, (form.headings, *form.rows), bold=1)
        sheet.freeze_panes = "B2"
    raw = io.BytesIO()
    book.save(raw)
    return _without_times(raw.getvalue())


def _about(twin: Twin) -> Iterable[tuple[Plain, ...]]:
    """Words in the first column are keys, as the headings of the other sheets are."""
    yield "title", twin.title
    yield "address", twin.address
    yield from (*twin.about, *twin.notices, *twin.cautions)
    for table in twin.tables:
        yield (None,)
        yield "table", table.key, table.title
        if table.note:
            yield "note", table.note
        for column in table.columns:
            group = f"{column.span}, " if column.span else ""
            yield "column", column.key, f"{group}{column.label}", column.unit or None
        for row in table.rows:
            if row.shown:
                yield "name", plain(row.cells[0], table, table.columns[0]), row.shown


def _fill(sheet: Worksheet, rows: Iterable[tuple[Plain, ...]], *, bold: int) -> None:
    widest: dict[str, int] = {}
    for number, row in enumerate(rows, start=1):
        for place, value in enumerate(row, start=1):
            if value is None or value == "":
                continue
            cell = sheet.cell(number, place)
            _set(cell, value)
            if number <= bold:
                cell.font = Font(bold=True)
                cell.alignment = Alignment(wrap_text=True, vertical="top")
            letter = cell.column_letter
            widest[letter] = max(widest.get(letter, 8), min(len(str(value)) + 2, 24))
    for letter, width in widest.items():
        sheet.column_dimensions[letter].width = width


def _set(cell: Cell, value: Plain) -> None:
    if isinstance(value, str):
        cell.value = _CONTROL.sub("\N{REPLACEMENT CHARACTER}", value)
        cell.data_type = "s"
    else:
        cell.value = value


def _without_times(raw: bytes) -> bytes:
    out = io.BytesIO()
    with (
        zipfile.ZipFile(io.BytesIO(raw)) as source,
        zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as target,
    ):
        for name in source.namelist():
            content = source.read(name)
            if name == "docProps/core.xml":
                content = _MODIFIED.sub(rb"\g<1>1980-01-01T00:00:00Z\g<2>", content)
            target.writestr(zipfile.ZipInfo(name, _NO_TIME.timetuple()[:6]), content)
    return out.getvalue()
