"""Tables that were printed or saved before, read back: a twin of ours, or a plain table of area,
sex, year, indicator and value."""

import json
import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from typing import Any

from server.intake.forms.lines import rows_of
from server.intake.layout import Layout, layout
from server.intake.mapping import Form
from server.results.keys import BadValue
from server.results.series import TooLarge
from server.sentences.numbers import whole
from server.sentences.text import _

ABOUT = "about"  # the sheet of a workbook of ours that says what it is
MOST_ROWS = 20_000
MOST_SHEETS = 40
# headings of a plain table, as compared: lower case without white around
HEADINGS = {
    "area": ("area", "area code", "region", "code"),
    "sex": ("sex",),
    "year": ("year", "period"),
    "indicator": ("indicator", "figure", "of", "measure"),
    "value": ("value", "printed", "number"),
    "edition": ("edition",),
    "settings": ("settings",),
}
_TELLING = ("title", "address", "edition", "settings", "collection")
_NUMBER = re.compile(r"[+\-\u2212]?\d[\d,]*(?:\.(\d+))?(?:[eE][+-]?\d+)?")


class NotLookedUp(BadValue):
    """A file that is no table, or does not say what it is of (422)."""


@dataclass(frozen=True, slots=True)
class PrintedRow:
    number: int  # in the file, as a spreadsheet counts
    texts: dict[str, str]  # by heading


@dataclass(frozen=True, slots=True)
class PrintedTable:
    key: str  # name of its sheet; empty: the file's only one
    headings: tuple[str, ...]
    rows: tuple[PrintedRow, ...]


@dataclass(frozen=True, slots=True)
class PrintedFile:
    name: str
    address: str = ""  # of the page it was saved from, where it says so
    said: dict[str, str] = field(default_factory=dict)  # what its first lines say
    tables: tuple[PrintedTable, ...] = ()


def read(content: bytes, name: str) -> PrintedFile:
    """Any form that intake can open, and JSON of ours. NotLookedUp where no table is found,
    TooLarge where it has more rows than can be looked up."""
    if content.lstrip()[:1] == b"{":
        return _json(content, name)
    first = layout(content, name)
    if first.found and not first.columns:
        raise _no_table(name)
    if any(tab.name == ABOUT for tab in first.tabs):
        return _workbook(content, name, [tab.name for tab in first.tabs][:MOST_SHEETS])
    said, rows = _parted(_all_rows(first))
    if not rows:
        raise _no_table(name)
    return PrintedFile(name, said.get("address", ""), said, (_table("", rows),))


def _no_table(name: str) -> NotLookedUp:
    return NotLookedUp(
        _(
            "In {name} no table was found. Hand in a file as it was saved here (CSV, XLSX or JSON),"
            " or a table with the columns area, sex, year, indicator and value.",
            name=name,
        )
    )


def _all_rows(of: Layout) -> list[tuple[int, tuple[str, ...]]]:
    """Heading and rows with their numbers in the file; blank ones left out."""
    texts = rows_of(of.body.decode(errors="replace"), of.delimiter)
    if len(texts) > MOST_ROWS:
        raise TooLarge(
            _(
                "{name} has {rows} rows; a table of at most {most} can be looked up. Hand in a part"
                " of it.",
                name=of.name,
                rows=whole(len(texts)),
                most=whole(MOST_ROWS),
            )
        )
    numbered = [(of.first - 1, of.columns), *((of.row(at), row) for at, row in enumerate(texts))]
    return [(number, row) for number, row in numbered if any(text.strip() for text in row)]


def _parted(
    rows: Sequence[tuple[int, tuple[str, ...]]],
) -> tuple[dict[str, str], list[tuple[int, tuple[str, ...]]]]:
    """First lines that tell what the table is, and the table."""
    said: dict[str, str] = {}
    for at, (_place, row) in enumerate(rows):
        texts = [text.strip() for text in row if text.strip()]
        word = texts[0].casefold().rstrip(":")
        if word not in _TELLING or len(texts) != 2 or texts[1].casefold() in _every_heading():
            return said, list(rows[at:])
        said[word] = texts[1]
    return said, []


def _every_heading() -> set[str]:
    return {name for names in HEADINGS.values() for name in names}


def _table(key: str, rows: Sequence[tuple[int, tuple[str, ...]]]) -> PrintedTable:
    headings = tuple(text.strip() for text in rows[0][1])
    return PrintedTable(
        key,
        headings,
        tuple(
            PrintedRow(number, dict(zip(headings, map(str.strip, row), strict=False)))
            for number, row in rows[1:]
        ),
    )


def _workbook(content: bytes, name: str, sheets: Iterable[str]) -> PrintedFile:
    said: dict[str, str] = {}
    tables = []
    for sheet in sheets:
        rows = _all_rows(layout(content, name, Form(sheet=sheet)))
        if sheet == ABOUT:
            said = {row[0].casefold(): row[1] for _at, row in rows if len(row) > 1 and row[0]}
        elif rows:
            tables.append(_table(sheet, rows))
    return PrintedFile(name, said.get("address", ""), said, tuple(tables))


def _json(content: bytes, name: str) -> PrintedFile:
    try:
        told = json.loads(content)
        tables = tuple(_of_json(key, figures["rows"]) for key, figures in told["figures"].items())
        return PrintedFile(name, str(told["address"]), {}, tables)
    except (ValueError, KeyError, TypeError, AttributeError, RecursionError) as error:
        raise _no_table(name) from error


def _of_json(key: str, rows: Sequence[dict[str, Any]]) -> PrintedTable:
    headings = tuple(dict.fromkeys(name for row in rows for name in row))
    return PrintedTable(
        key,
        headings,
        tuple(
            PrintedRow(at, {name: _text(value) for name, value in row.items()})
            for at, row in enumerate(rows, start=1)
        ),
    )


def _text(value: object) -> str:
    """As the CSV twin writes it; a gap is empty."""
    if isinstance(value, dict):
        return ""
    return value if isinstance(value, str) else repr(value)


@dataclass(frozen=True, slots=True)
class PrintedNumber:
    value: float
    decimals: int

    def is_of(self, value: float) -> bool:
        """Whether this is how the value is printed to so many decimals; a tie goes either way."""
        room = 0.5 * 10.0**-self.decimals
        return abs(value - self.value) <= room + 1e-12 * max(1.0, abs(value))

    def is_cut_from(self, value: float) -> bool:
        """Whether digits were cut off instead of being rounded."""
        return abs(value - self.value) < 10.0**-self.decimals


def number(text: str) -> PrintedNumber | None:
    """A number as people print it, with its decimals; None: it is none.

    >>> number("1,204.50")
    PrintedNumber(value=1204.5, decimals=2)
    >>> number("\u22120.3"), number("withheld")
    (PrintedNumber(value=-0.3, decimals=1), None)
    """
    bare = text.strip().rstrip("p").strip()
    found = _NUMBER.fullmatch(bare)
    if found is None:
        return None
    value = float(bare.replace("\u2212", "-").replace(",", ""))
    exponent = re.search(r"[eE]([+-]?\d+)", bare)
    decimals = len(found[1] or "") - (int(exponent[1]) if exponent else 0)
    return PrintedNumber(value, min(max(decimals, 0), 300))


def columns_of(table: PrintedTable) -> dict[str, str]:
    """Which heading of a plain table holds what."""
    found: dict[str, str] = {}
    for field_, names in HEADINGS.items():
        for heading in table.headings:
            if heading.casefold() in names:
                found.setdefault(field_, heading)
    return found
