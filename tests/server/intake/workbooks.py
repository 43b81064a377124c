"""Workbooks as a spreadsheet writes them, and as nobody should."""

import io
import re
import zipfile
from collections.abc import Callable, Iterable, Mapping

from openpyxl import Workbook
from openpyxl.worksheet.worksheet import Worksheet

Cells = Iterable[Iterable[object]]
SHEET = "xl/worksheets/sheet1.xml"


def xlsx(
    cells: Cells,
    *,
    name: str = "Counts",
    more: Mapping[str, Cells] | None = None,
    change: Callable[[Worksheet], object] = lambda sheet: None,
) -> bytes:
    """A workbook with these cells on its first sheet and others on further ones."""
    book = Workbook()
    first = book.active
    assert isinstance(first, Worksheet)
    first.title = name
    for sheet, rows in (
        (first, cells),
        *((book.create_sheet(n), c) for n, c in (more or {}).items()),
    ):
        for row in rows:
            sheet.append(list(row))
    change(first)
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def table_cells(table: Iterable[Mapping[str, object]]) -> list[list[object]]:
    """A table of rows with a heading above."""
    rows = [list(row.values()) for row in table]
    heading: list[object] = list(next(iter(table)))  # type: ignore[call-overload]
    return [heading, *rows]


def repacked(content: bytes, parts: Mapping[str, Callable[[str], str] | bytes]) -> bytes:
    """A workbook with some parts changed, or put in anew."""
    stream = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(content)) as old, zipfile.ZipFile(stream, "w", 8) as new:
        for name in old.namelist():
            change = parts.get(name)
            text = old.read(name)
            if callable(change):
                text = change(text.decode()).encode()
            if not isinstance(change, bytes):
                new.writestr(name, text)
        for name, change in parts.items():
            if isinstance(change, bytes):
                new.writestr(name, change)
    return stream.getvalue()


def with_kept_values(content: bytes) -> bytes:
    """Its formulas with results, as a spreadsheet that was saved keeps them: 7 each."""
    return repacked(
        content,
        {SHEET: lambda text: re.sub(r"(<f>[^<]*</f>)<v ?/?>(</v>)?", r"\1<v>7</v>", text)},
    )
