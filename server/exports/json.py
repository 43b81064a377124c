"""A page as JSON: its address, what stands beside the figures, and the figures of every table.

The bytes under "figures" depend on the address and the engine alone: what may change under an
address, such as the name of an area, stands elsewhere (notices, headings and names under "tables").
Numbers are in full, and a gap is an object with its kind and reason.
"""

from typing import Any

import orjson

from server.exports.flat import all_rows, plain
from server.exports.table import Column, Gap, Row, Table
from server.exports.twin import Told, Twin

MEDIA_TYPE = "application/json"


def write(twin: Twin) -> bytes:
    """The file's bytes."""
    content = {
        "address": twin.address,
        "title": twin.title,
        "about": _said(twin.about),
        "notices": _said(twin.notices),
        "cautions": _said(twin.cautions),
        "tables": {table.key: _heads(table) for table in twin.tables},
        "figures": {table.key: _figures(table) for table in twin.tables},
    }
    return orjson.dumps(content, option=orjson.OPT_APPEND_NEWLINE)


def _said(told: tuple[Told, ...]) -> list[dict[str, str]]:
    return [{"word": word, "text": text} for word, text in told]


def _heads(table: Table) -> dict[str, Any]:
    names = {str(row.cells[0]): row.shown for row in all_rows(table) if row.shown}
    heads = {"title": table.title, "columns": [*map(_column, table.columns)]}
    return (
        heads | ({"names": names} if names else {}) | ({"note": table.note} if table.note else {})
    )


def _figures(table: Table) -> dict[str, Any]:
    rows = [_row(table, row) for row in all_rows(table)]
    total = {"total": rows.pop()} if table.total else {}
    return {"rows": rows} | total


def _column(column: Column) -> dict[str, str]:
    named = {"key": column.key, "label": column.label, "unit": column.unit, "group": column.span}
    return {name: text for name, text in named.items() if text}


def _row(table: Table, row: Row) -> dict[str, Any]:
    out: dict[str, Any] = {}
    for column, cell in zip(table.columns, row.cells, strict=True):
        if isinstance(cell, Gap):
            reason = {"reason": cell.reason} if cell.reason else {}
            out[column.key] = {"missing": cell.kind.value} | reason
        else:
            out[column.key] = plain(cell, table, column)
    if row.second:
        out["remark"] = row.second
    if row.provisional:
        out["provisional"] = True
    return out
