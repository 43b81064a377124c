"""Small tables of an upload that hold no counts: what becomes of areas, breaks, a cause list.

Their columns are known by their headings alone; nothing is asked about them.
"""

import csv
import io
import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass

import numpy as np

from server.intake.layout import Layout
from server.intake.recognising.names import named

MOST_ROWS = 5_000
_NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?")
_PARTS = re.compile(r"(\d+) ?/ ?([1-9]\d*)")

# headings by role and field, as compared: lower case, every run of other signs one space
HEADINGS: dict[str, dict[str, str]] = {
    "areas": {
        "code": "code|old code|area|area code|code before",
        "becomes": "becomes|new code|code after",
        "from": "from|first year|from year",
        "to": "to|last year|to year",
        "share": "share|share of the counts",
        "counts": "counts|of counts",
        "sex": "sex",
        "age": "age|age group|ages",
        "name": "name|new name|area name",
        "parent": "parent|part of|whole",
    },
    "breaks": {
        "area": "area|area code|code",
        "year": "year|first year|period",
        "kind": "kind|kind of break",
        "cause": "cause|cause of death",
        "note": "note|why|reason",
        "ratio": "ratio|comparability ratio",
        "ratio_error": "ratio error|standard error|standard error of the ratio",
    },
    "causes": {
        "code": "code|cause code|code of the cause",
        "name": "name|cause|label|cause of death|title",
        "parent": "part of|parent|group|part of code",
        "codes": "codes|ranges|icd codes|icd 10|icd 10 codes|icd 9|icd 9 codes|range",
        "kind": "kind|kind of cause",
        "care": "care",
        "sex": "sex|only sex",
    },
}
NEEDED = {"areas": ("code", "becomes"), "breaks": ("year", "kind"), "causes": ("code", "name")}
_COUNTED = ("year", "age", "deaths", "population", "births", "rate")


@dataclass(frozen=True, slots=True)
class Line:
    """One row: the text of each field that the table has a column for."""

    row: int  # as in the file, the heading being row 1
    texts: Mapping[str, str]

    def __getitem__(self, field: str) -> str:
        return self.texts.get(field, "")


@dataclass(frozen=True, slots=True)
class SmallTable:
    role: str
    name: str  # of the file
    columns: Mapping[str, str]  # field: heading in the file
    unused: tuple[str, ...]  # headings that are none of the fields
    lines: tuple[Line, ...]
    row_count: int

    def column(self, field: str) -> str:
        """The heading over a field; the field's own name where there is none."""
        return self.columns.get(field, field)


def small_table(file: Layout, role: str) -> SmallTable:
    """Read a file that passed the checks of files. Of a table above MOST_ROWS no line is read."""
    columns: dict[str, str] = {}
    for heading in file.columns:
        field = field_of(heading, role)
        if field and field not in columns:
            columns[field] = heading
    place = {field: file.columns.index(heading) for field, heading in columns.items()}
    lines = []
    if file.row_count <= MOST_ROWS:
        text = io.StringIO(file.body.decode(errors="replace"), newline="")
        written = (row for row in csv.reader(text, delimiter=file.delimiter) if row)
        for at, row in zip(np.flatnonzero(file.fields).tolist(), written, strict=False):
            texts = {field: row[n].strip() for field, n in place.items() if n < len(row)}
            if any(texts.values()):
                lines.append(Line(at + 2, texts))
    return SmallTable(
        role=role,
        name=file.name,
        columns=columns,
        unused=tuple(one for one in file.columns if one not in columns.values()),
        lines=tuple(lines),
        row_count=file.row_count,
    )


def written(role: str, rows: Iterable[Mapping[str, str]]) -> bytes:
    """A small table as a file, from the texts of its fields.

    >>> written("breaks", [{"year": "2012", "kind": "population"}]).decode().splitlines()
    ['area,year,kind,cause,note,ratio,ratio_error', ',2012,population,,,,']
    """
    text = io.StringIO(newline="")
    writer = csv.DictWriter(text, list(HEADINGS[role]), restval="", lineterminator="\n")
    writer.writeheader()
    writer.writerows(rows)
    return text.getvalue().encode()


def field_of(heading: str, role: str) -> str:
    """The field a heading stands for; empty where it is none.

    >>> field_of("First year", "areas")
    'from'
    """
    plain = " ".join(re.split(r"[^0-9a-z]+", heading.casefold())).strip()
    for field, words in HEADINGS[role].items():
        if plain in words.split("|"):
            return field
    return ""


def role_of(headings: Iterable[str]) -> str:
    """The small table that has these headings; empty where none has. One that tells codes and
    names is a list of causes where it counts nothing.

    >>> role_of(["code", "name", "codes"]), role_of(["code", "name", "deaths"])
    ('causes', '')
    """
    said = list(headings)
    for role, needed in NEEDED.items():
        if set(needed) <= {field_of(heading, role) for heading in said}:
            counts = role == "causes" and any(named(heading, _COUNTED) for heading in said)
            return "" if counts else role
    return ""


def number(text: str) -> float | None:
    """A number, also as a fraction of whole numbers; None where it is neither.

    >>> number("0.25"), number("1/3"), number("a third")
    (0.25, 0.3333333333333333, None)
    """
    if parts := _PARTS.fullmatch(text):
        return int(parts[1]) / int(parts[2])
    return float(text) if _NUMBER.fullmatch(text) else None
