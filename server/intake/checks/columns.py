"""Checks of the mapping against the file: is every needed column there."""

from collections.abc import Iterator
from dataclasses import dataclass

from engine.panel import SEXES
from server.intake.areas import is_code
from server.intake.cells import whole_code
from server.intake.checks.check import Check
from server.intake.labels import read_year
from server.intake.layout import Layout
from server.intake.mapping import COLUMNS, ROLES, Mapping
from server.intake.problems import Fault, Problem


@dataclass(frozen=True, slots=True)
class Mapped:
    """A file, what it is for, and how it is to be read."""

    file: Layout
    role: str
    mapping: Mapping


def _missing(mapped: Mapped) -> Iterator[Fault]:
    needed = ["year", *ROLES[mapped.role]]
    if mapped.role != "births":
        needed += ["age"] + ([] if mapped.mapping.only_sex else ["sex"])
    columns = ", ".join(mapped.file.columns)[:200]
    for field in needed:
        if not mapped.mapping.column(field):
            yield Fault(column=field, row=1, values={"field": field, "columns": columns})


def _unknown(mapped: Mapped) -> Iterator[Fault]:
    columns = ", ".join(mapped.file.columns)[:200]
    for field in COLUMNS:
        column = mapped.mapping.column(field)
        if column and column not in mapped.file.columns:
            yield Fault(column=column, row=1, values={"field": field, "columns": columns})


def _no_area(mapped: Mapped) -> Iterator[Fault]:
    mapping = mapped.mapping
    given = mapping.area or mapping.area_name or mapping.only_area or mapping.only_area_name
    if not given:
        yield Fault(column="area", row=1)


def _twice(mapped: Mapped) -> Iterator[Fault]:
    fields: dict[str, list[str]] = {}
    for field in COLUMNS:
        if column := mapped.mapping.column(field):
            fields.setdefault(column, []).append(field)
    for column, used in fields.items():
        if len(used) > 1:
            yield Fault(column=column, row=1, values={"fields": ", ".join(used)})


def _bad_sex(mapped: Mapped) -> Iterator[Fault]:
    for text, sex in (("", mapped.mapping.only_sex), *mapped.mapping.sex_codes):
        if sex not in SEXES and (sex or text):
            yield Fault(values={"text": text, "sex": sex})


def _bad_year(mapped: Mapped) -> Iterator[Fault]:
    for year in mapped.mapping.provisional_years:
        if str(read_year(year)) != year:
            yield Fault(values={"text": year})


def _bad_code(mapped: Mapped) -> Iterator[Fault]:
    mapping = mapped.mapping
    for code in (mapping.only_area, whole_code(mapping), *mapping.delivered):
        if code and not is_code(code):
            yield Fault(values={"text": code})


CHECKS: tuple[Check[Mapped], ...] = (
    Check(
        key="missing_column",
        severity="error",
        meaning="A column without which the file says nothing is missing or was not recognised.",
        found="no column for it among {columns}",
        expected="a column mapped to {field}",
        remedy="Say in the mapping which column it is, or add it to the file.",
        find=_missing,
    ),
    Check(
        key="unknown_column",
        severity="error",
        meaning="The mapping names a column that the file does not have.",
        found="the columns {columns}",
        expected="this column, mapped to {field}",
        remedy="Correct the mapping, or the heading of the file.",
        find=_unknown,
    ),
    Check(
        key="no_area",
        severity="error",
        meaning="It is not said which area the counts are of.",
        found="no column of areas",
        expected="a column of area codes or names, or one area for the whole file",
        remedy="Give the code and the name of the area in the mapping.",
        find=_no_area,
    ),
    Check(
        key="column_used_twice",
        severity="error",
        meaning="The mapping takes one column for two things.",
        found="this column mapped to {fields}",
        expected="a column of its own for each",
        remedy="Correct the mapping.",
        find=_twice,
    ),
    Check(
        key="bad_sex_setting",
        severity="error",
        meaning="The mapping gives a code for the sex a meaning that is none.",
        found="“{sex}” as the meaning of “{text}”",
        expected="f, m or p (female, male, persons)",
        remedy="Correct the mapping.",
        find=_bad_sex,
    ),
    Check(
        key="bad_provisional_year",
        severity="error",
        meaning="The mapping names a provisional year that is no calendar year.",
        found="“{text}”",
        expected="a calendar year of four digits, such as 2014",
        remedy="Correct the mapping.",
        find=_bad_year,
    ),
    Check(
        key="bad_area_setting",
        severity="error",
        meaning="A code of an area in the mapping has signs that no address can carry.",
        found="“{text}” as the code of an area",
        expected="1 to 32 letters A–Z, digits, full stops, hyphens or underscores",
        remedy="Correct the mapping.",
        find=_bad_code,
    ),
)


def problems_of(mapped: Mapped) -> list[Problem]:
    return [problem for check in CHECKS for problem in check.problems(mapped, mapped.file.name)]
