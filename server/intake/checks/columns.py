"""Checks of the mapping against the file: is every needed column there."""

from collections.abc import Iterator
from dataclasses import dataclass

from engine.panel import SEXES
from server.intake.areas import is_code
from server.intake.cells import only_code, whole_code
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


def _bad_setting(mapped: Mapped) -> Iterator[Fault]:
    mapping = mapped.mapping
    sexes = [("only_sex", mapping.only_sex), *mapping.sex_codes]
    for what, sex in sexes:
        if sex and sex not in SEXES:
            yield Fault(values={"what": f"{what}: {sex}", "expected": "f, m, p"})
    for year in mapping.provisional_years:
        if str(read_year(year)) != year:
            yield Fault(values={"what": f"provisional_years: {year}", "expected": "2014"})
    codes = [("whole", whole_code(mapping)), *(("delivered", code) for code in mapping.delivered)]
    if not (mapping.area or mapping.area_name):
        codes.append(("only_area", mapping.only_area if not only_code(mapping) else ""))
    for what, code in codes:
        if code and not is_code(code):
            yield Fault(values={"what": f"{what}: {code}", "expected": "A-Z a-z 0-9 _ . -"})


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
        key="bad_setting",
        severity="error",
        meaning="Something set in the mapping cannot be used.",
        found="{what}",
        expected="in this form: {expected}",
        remedy="Correct it in the mapping.",
        find=_bad_setting,
    ),
)


def problems_of(mapped: Mapped) -> list[Problem]:
    return [problem for check in CHECKS for problem in check.problems(mapped, mapped.file.name)]
