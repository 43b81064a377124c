"""One table written in every form in which an analyst may have it."""

import csv
import io
from collections.abc import Sequence
from dataclasses import dataclass, replace
from gzip import compress

from server.intake.mapping import Form, Mapping
from server.intake.parsing import Handed
from tests.server.intake.tables import AGES, Row
from tests.server.intake.workbooks import xlsx

NAMES = ("Nørre å", "Süd “Küste”")  # the second has marks that Latin-1 lacks
NUMBERS = ("deaths", "population")
WIDE = {"age": tuple(AGES), "sex": ("f", "m"), "year": ("2010", "2011"), "number": NUMBERS}
LABELS = ("area", "year", "sex", "age")
OPEN = Mapping(area_name="area", year="year", sex="sex", age="age")


@dataclass(frozen=True)
class Written:
    """How a table is written down."""

    encoding: str = "utf-8"
    mark: bool = False  # byte order mark
    delimiter: str = ","
    decimal: str = "."
    thousands: str = ""
    across: tuple[str, ...] = ()
    heading_rows: int = 1
    titles: int = 0
    notes: int = 0
    end: str = "\n"
    packed: bool = False
    workbook: bool = False


def table(names: Sequence[str] = NAMES) -> list[Row]:
    """Deaths and populations, some with half a person; no two rows have the same."""
    cells = [(a, y, s, g) for a in names for y in WIDE["year"] for s in WIDE["sex"] for g in AGES]
    return [
        dict(zip(LABELS, cell, strict=True)) | {"deaths": 7 + n, "population": 1_234_567.5 + 97 * n}
        for n, cell in enumerate(cells)
    ]


def handed(rows: list[Row], how: Written) -> Handed:
    """The table as a file, with the mapping that says how it is written."""
    form = Form(
        encoding="" if how.workbook or how.mark else how.encoding,
        delimiter="" if how.workbook else how.delimiter,
        heading=1 + how.titles,
        heading_rows=how.heading_rows,
        decimal=how.decimal,
        thousands=how.thousands,
    )
    grid, mapping = _grid(rows, how, form)
    last = [["Source: the register of the isle"]] * how.notes
    blank: list[list[object]] = [[]] if how.notes else []
    cells = [["Deaths and people"]] * how.titles + grid + blank + last
    content = xlsx(cells) if how.workbook else _text(cells, how)
    return Handed("counts", "counts", compress(content) if how.packed else content, mapping)


def _grid(rows: list[Row], how: Written, form: Form) -> tuple[list[list[object]], Mapping]:
    """Heading and rows, long or wide."""
    if not how.across:
        mapping = replace(OPEN, deaths="deaths", population="population", form=form)
        names = [*LABELS, *NUMBERS]
        heading = [[""] * len(names)] * (how.heading_rows - 1) + [names]
        return [*heading, *([row[name] for name in names] for row in rows)], mapping
    kept = [label for label in LABELS if label not in how.across]
    stood = [label for label in how.across if label != "number"]
    numbers = NUMBERS if "number" in how.across else NUMBERS[:1]
    groups = list(dict.fromkeys(tuple(row[label] for label in stood) for row in rows))
    columns = [(*group, number) for group in groups for number in numbers]
    order = [*stood, "number"] if "number" in how.across else stood
    texts = [tuple(map(str, column[: len(order)])) for column in columns]
    by_place: dict[tuple[object, ...], dict[tuple[object, ...], Row]] = {}
    for row in rows:
        place = tuple(row[label] for label in kept)
        by_place.setdefault(place, {})[tuple(row[label] for label in stood)] = row
    body = [
        [*place, *(here[tuple(column[:-1])][str(column[-1])] for column in columns)]
        for place, here in by_place.items()
    ]
    heading = _heading(kept, texts, how.heading_rows)
    names = [" ".join(text) for text in texts]
    mapping = replace(
        OPEN,
        **dict.fromkeys(stood, ""),
        form=replace(
            form,
            across=tuple(order),
            across_columns=tuple((name, *text) for name, text in zip(names, texts, strict=True)),
            across_number="" if "number" in how.across else "deaths",
        ),
    )
    return [*heading, *body], mapping


def _heading(kept: list[str], texts: list[tuple[str, ...]], rows: int) -> list[list[object]]:
    """In one row, or each matter in a row of its own, an upper one written once for its run."""
    if rows == 1:
        return [[*kept, *(" ".join(text) for text in texts)]]
    upper = [[*[""] * len(kept), *_once([text[at] for text in texts])] for at in range(rows - 1)]
    return [*upper, [*kept, *(" ".join(text[rows - 1 :]) for text in texts)]]


def _once(texts: list[str]) -> list[str]:
    """Each run of the same text as a merged cell: the text, then blanks."""
    before = ["", *texts[:-1]]
    return [text if text != last else "" for text, last in zip(texts, before, strict=True)]


def _text(cells: list[list[object]], how: Written) -> bytes:
    stream = io.StringIO()
    writer = csv.writer(stream, delimiter=how.delimiter, lineterminator=how.end)
    writer.writerows([[_field(value, how) for value in row] for row in cells])
    mark = "\ufeff" if how.mark else ""
    return (mark + stream.getvalue()).encode(how.encoding)


def _field(value: object, how: Written) -> str:
    if isinstance(value, str):
        return value
    whole, _, part = f"{value:,}".partition(".")
    part = part if part.strip("0") else ""
    return whole.replace(",", how.thousands) + (how.decimal + part if part else "")
