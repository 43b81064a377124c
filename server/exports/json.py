"""A page as JSON: its address, what stands beside the figures, and the figures of every table.

The bytes under "figures" depend on the address and the engine alone: what may change under an
address, such as the name of an area, stands elsewhere (notices, headings and names under "tables").
Numbers are in full, and a gap is an object with its kind and reason.
"""

from typing import Any

import orjson

from server.exports import status
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
    seen = status.observed(table)
    own: dict[str, str] = {}
    for at, (column, cell) in enumerate(zip(table.columns, row.cells, strict=True)):
        mark = status.of_cell(row, at, column) if at in seen else ""
        if isinstance(cell, Gap):
            reason = {"reason": cell.reason} if cell.reason else {}
            secret = {"conf_status": status.CONFIDENTIAL} if status.withheld(row, at) else {}
            known = {"obs_status": mark} if mark else {}
            out[column.key] = {"missing": cell.kind.value} | reason | known | secret
            continue
        if mark and mark != status.of_row(row):
            own[column.key] = mark
        out[column.key] = plain(cell, table, column)
    if row.second:
        out["remark"] = row.second
    if row.provisional:
        out["provisional"] = True
    if row.revised:
        out["revised"] = True
    if seen:
        out["obs_status"] = status.of_row(row)
    if own:
        out["own_obs_status"] = own
    return out
