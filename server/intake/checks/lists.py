"""Checks of the small tables of an upload as tables: their columns, codes, years and numbers."""

from collections.abc import Callable, Iterator
from dataclasses import dataclass

from server.intake.areas import is_code
from server.intake.break_rows import NONE
from server.intake.causes.own import read_care, read_kind, read_only_sex
from server.intake.checks.check import Check
from server.intake.labels import ALL_AGES, read_age, read_sex, read_year
from server.intake.lists import MOST_ROWS, NEEDED, Line, SmallTable, number
from server.intake.problems import Fault, Problem, Text
from server.intake.successions import COUNTS
from server.store.records import BREAKS, CARE, CAUSE_KINDS


@dataclass(frozen=True, slots=True)
class _Field:
    """What may stand in a field, and whether it may be left empty."""

    role: str
    name: str
    reads: Callable[[str], bool]
    expected: str
    needed: bool = False


def _year(text: str) -> bool:
    return str(read_year(text)) == text


def _share(text: str) -> bool:
    found = number(text)
    return found is not None and 0 <= found <= 1


def _positive(text: str) -> bool:
    found = number(text)
    return found is not None and 0 < found < 100


def _error(text: str) -> bool:
    found = number(text)
    return found is not None and 0 <= found < 100


def _age(text: str) -> bool:
    age = read_age(text)
    return age is not None and (age is ALL_AGES or age.start >= 0)


def _sex(text: str) -> bool:
    return read_sex(text) in ("f", "m", "p")


_CODE = Text("1 to 32 letters A–Z, digits, full stops, hyphens or underscores")
_YEAR = Text("a year of four digits, such as 2014")
_FIELDS = (
    _Field("areas", "code", is_code, _CODE, needed=True),
    _Field("areas", "becomes", is_code, _CODE, needed=True),
    _Field("areas", "parent", is_code, _CODE),
    _Field("areas", "from", _year, _YEAR),
    _Field("areas", "to", _year, _YEAR),
    _Field("areas", "share", _share, Text("a number from 0 to 1, such as 0.25 or 1/4")),
    _Field(
        "areas",
        "counts",
        COUNTS.__contains__,
        Text("nothing, or one of {known}", known=", ".join(COUNTS)),
    ),
    _Field("areas", "sex", _sex, Text("f or m, or nothing for both")),
    _Field("areas", "age", _age, Text("an age group, such as 5-9 or 85+, or nothing for all ages")),
    _Field("breaks", "area", is_code, Text("the code of an area, or nothing for every area")),
    _Field("breaks", "year", _year, _YEAR, needed=True),
    _Field(
        "breaks",
        "kind",
        (*BREAKS, NONE).__contains__,
        Text(
            "one of {known}; or {none}, which ends the breaks of that area and year",
            known=", ".join(BREAKS),
            none=NONE,
        ),
        needed=True,
    ),
    _Field("breaks", "cause", is_code, _CODE),
    _Field("breaks", "ratio", _positive, Text("a number above 0, counts after over counts before")),
    _Field("causes", "code", is_code, _CODE, needed=True),
    _Field("causes", "parent", is_code, _CODE),
    _Field(
        "causes",
        "kind",
        lambda text: read_kind(text) is not None,
        Text("nothing, or one of {known}", known=", ".join(CAUSE_KINDS)),
    ),
    _Field(
        "causes",
        "care",
        lambda text: read_care(text) is not None,
        Text("nothing, or one of {known}", known=", ".join(CARE)),
    ),
    _Field(
        "causes",
        "sex",
        lambda text: read_only_sex(text) is not None,
        Text("f or m, or nothing for both"),
    ),
    _Field("breaks", "ratio_error", _error, Text("a number of at least 0, the standard error")),
)


def _missing(table: SmallTable) -> Iterator[Fault]:
    headings = ", ".join((*table.columns.values(), *table.unused))[:200]
    for field in NEEDED[table.role]:
        if field not in table.columns:
            yield Fault(column=field, row=1, values={"field": field, "columns": headings})


def _too_long(table: SmallTable) -> Iterator[Fault]:
    if table.row_count > MOST_ROWS:
        yield Fault(values={"count": table.row_count, "most": MOST_ROWS})


def _unreadable(table: SmallTable) -> Iterator[Fault]:
    for field in _FIELDS:
        if field.role == table.role and field.name in table.columns:
            for line in table.lines:
                text = line[field.name]
                if (text or field.needed) and not field.reads(text):
                    yield _fault(table, line, field.name, expected=field.expected)


def _backwards(table: SmallTable) -> Iterator[Fault]:
    for line in table.lines:
        first, last = line["from"], line["to"]
        if _year(first) and _year(last) and last < first:
            yield _fault(table, line, "to", first=first)


def _fault(table: SmallTable, line: Line, field: str, **values: str) -> Fault:
    said = {"text": line[field], **values}
    return Fault(column=table.column(field), file=table.name, row=line.row, values=said)


CHECKS: tuple[Check[SmallTable], ...] = (
    Check(
        key="list_without_column",
        severity="error",
        meaning="A small table, of areas over time, breaks or causes, lacks a column it cannot do "
        "without.",
        found="no column of this name among {columns}",
        expected="a column headed {field}",
        remedy="Head the column as the template does, or add it.",
        find=_missing,
    ),
    Check(
        key="list_too_long",
        severity="error",
        meaning="A table of areas over time, of breaks or of causes is longer than any could be, "
        "so that it may be another file.",
        found="{count} rows",
        expected="at most {most}",
        remedy="Look whether the files were exchanged.",
        find=_too_long,
    ),
    Check(
        key="list_unreadable",
        severity="error",
        meaning="A field of a table of areas over time, of breaks or of causes cannot be read.",
        found="“{text}”",
        expected="{expected}",
        remedy="Correct the field; the template shows the form.",
        find=_unreadable,
    ),
    Check(
        key="list_backwards",
        severity="error",
        meaning="A row of a table of areas over time ends before it begins.",
        found="the last year {text}",
        expected="a year not before {first}, the first year",
        remedy="Exchange the two years, or correct one of them.",
        find=_backwards,
    ),
)


def problems_of(table: SmallTable) -> list[Problem]:
    return [problem for check in CHECKS for problem in check.problems(table, table.name)]
