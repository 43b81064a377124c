"""Checks of the mapping against the file: is every needed column there."""

from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass

from engine.panel import SEXES
from server.intake.areas import is_code
from server.intake.cells import whole_code
from server.intake.checks.check import Check
from server.intake.forms.across import spread, wrong
from server.intake.forms.found import faults
from server.intake.forms.units import multiplier, suggested
from server.intake.labels import NOT_STATED, read_year
from server.intake.layout import MOST_ROWS, Layout
from server.intake.lists import field_of
from server.intake.mapping import (
    COLUMNS,
    JANUARY,
    LISTS,
    NUMBERS,
    RATE_KINDS,
    ROLES,
    Mapping,
    numbers_of,
)
from server.intake.problems import Fault, Problem


@dataclass(frozen=True, slots=True)
class Mapped:
    """A file, what it is for, and how it is to be read."""

    file: Layout
    role: str
    mapping: Mapping
    own_causes: bool = False  # a cause list of the user's own was handed in


def _missing(mapped: Mapped) -> Iterator[Fault]:
    needed = ["year", *ROLES[mapped.role]]
    if mapped.role != "births":
        needed += ["age"] + ([] if mapped.mapping.only_sex else ["sex"])
    columns = _named(mapped.file)
    across = mapped.mapping.form.across
    said = {*across, *(wide.numbers if (wide := spread(mapped.mapping.form)) else ())}
    for field in needed:
        if not mapped.mapping.column(field) and field not in said:
            values = {"field": field, "columns": columns}
            yield Fault(column=field, row=mapped.file.form.heading, values=values)


def _doubled(mapped: Mapped) -> Iterator[Fault]:
    """Of headings that nothing is taken from, two may be the same."""
    file, form = mapped.file, mapped.mapping.form
    taken = [mapped.mapping.column(field) for field in COLUMNS]
    if mapped.role in LISTS:
        taken = [one for one in file.columns if field_of(one, mapped.role)]
    taken += [column[0] for column in form.across_columns if column]
    times = Counter(file.columns)
    for column in filter(None, dict.fromkeys(taken)):
        if times[column] > 1:
            yield Fault(column=column, row=form.heading, values={"count": times[column]})


def _unknown(mapped: Mapped) -> Iterator[Fault]:
    columns = _named(mapped.file)
    across = [("across", *column[:1]) for column in mapped.mapping.form.across_columns]
    for field, *column in [*((field, mapped.mapping.column(field)) for field in COLUMNS), *across]:
        if column and column[0] and column[0] not in mapped.file.columns:
            values = {"field": field, "columns": columns}
            yield Fault(column=column[0], row=mapped.file.form.heading, values=values)


def _no_area(mapped: Mapped) -> Iterator[Fault]:
    mapping = mapped.mapping
    given = mapping.area or mapping.area_name or mapping.only_area or mapping.only_area_name
    if not given:
        yield Fault(column="area", row=mapped.file.form.heading)


def _twice(mapped: Mapped) -> Iterator[Fault]:
    fields: dict[str, list[str]] = {}
    for field in COLUMNS:
        if taken := mapped.mapping.column(field):
            fields.setdefault(taken, []).append(field)
    for column in filter(None, mapped.mapping.form.across_columns):
        fields.setdefault(column[0], []).append(" ".join(column[1:]))
    for name, used in fields.items():
        if len(used) > 1:
            told = {"fields": ", ".join(used)}
            yield Fault(column=name, row=mapped.file.form.heading, values=told)


def _bad_sex(mapped: Mapped) -> Iterator[Fault]:
    for text, sex in (("", mapped.mapping.only_sex), *mapped.mapping.sex_codes):
        known = (*SEXES, NOT_STATED) if text else SEXES
        if sex not in known and (sex or text):
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


def _bad_across(mapped: Mapped) -> Iterator[Fault]:
    mapping = mapped.mapping
    taken = [field for field in COLUMNS if mapping.column(field)]
    taken += ["sex"] if mapping.only_sex else []
    yield from faults(wrong(mapping.form, mapped.role, taken), "bad_across")


def _too_many_counts(mapped: Mapped) -> Iterator[Fault]:
    groups = len(set(mapped.mapping.form.across_columns)) or 1
    if mapped.file.row_count * groups > MOST_ROWS:
        yield Fault(values={"count": mapped.file.row_count * groups, "most": MOST_ROWS})


def _numbers_at(mapped: Mapped) -> Iterator[tuple[str, str]]:
    """Each heading under which a kind of number stands."""
    for number in numbers_of(mapped.role):
        if column := mapped.mapping.column(number):
            yield number, column
    if wide := spread(mapped.mapping.form):
        for number in wide.numbers:
            yield from ((number, heading) for heading in wide.headings(number) if heading)


def _unit_not_stated(mapped: Mapped) -> Iterator[Fault]:
    stated = dict(mapped.mapping.units)
    told: set[str] = set()
    for number, heading in _numbers_at(mapped):
        if number not in stated and number not in told and (unit := suggested(heading)):
            told.add(number)
            values = {"number": number, "unit": unit}
            yield Fault(column=heading, row=mapped.file.form.heading, values=values)


def _bad_unit(mapped: Mapped) -> Iterator[Fault]:
    for number, text in mapped.mapping.units:
        if number not in NUMBERS or multiplier(text) is None:
            yield Fault(values={"number": number, "text": text})


def _rate_kind(mapped: Mapped) -> Iterator[Fault]:
    if mapped.role == "rates" and mapped.mapping.rate_is not in RATE_KINDS:
        yield Fault(column=mapped.mapping.rate, values={"text": mapped.mapping.rate_is})


def _population_kind(mapped: Mapped) -> Iterator[Fault]:
    if mapped.mapping.population_is not in ("", JANUARY):
        yield Fault(values={"text": mapped.mapping.population_is})


def _merged_numbers(mapped: Mapped) -> Iterator[Fault]:
    headings = {heading for _, heading in _numbers_at(mapped)}
    places = {place: name for place, name in enumerate(mapped.file.columns, 1) if name in headings}
    for one in mapped.file.merged:
        if one.column in places:
            yield Fault(
                column=places[one.column],
                row=one.row,
                last_row=one.last_row,
                rows=one.last_row - one.row + 1,
            )


def _named(file: Layout) -> str:
    return ", ".join(filter(None, file.columns))[:200]


DOUBLED: Check[Mapped] = Check(
    key="doubled_heading",
    severity="error",
    meaning="Two columns have the same name, so that it is not known which is meant. Of "
    "columns that nothing is taken from it does not matter.",
    found="this name over {count} columns",
    expected="a name of its own over each column",
    remedy="Rename or take out all but one of them.",
    find=_doubled,
)

CHECKS: tuple[Check[Mapped], ...] = (
    DOUBLED,
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
    Check(
        key="bad_across",
        severity="error",
        meaning="What the mapping says of a wide table contradicts itself or leaves something "
        "open.",
        found="{what}",
        expected="for each heading its age, sex, year and kind of number, each combination once, "
        "and none of them also in a column",
        remedy="Correct what the headings are said to mean.",
        find=_bad_across,
    ),
    Check(
        key="too_many_counts",
        severity="error",
        meaning="A wide table holds more numbers than one upload may.",
        found="{count} numbers",
        expected="at most {most}",
        remedy="Split the file by years or areas and upload the parts one after the other.",
        find=_too_many_counts,
    ),
    Check(
        key="merged_number",
        severity="error",
        meaning="A number stands in a cell merged over several rows, so that it is not known which "
        "of them it is of.",
        found="one number for several rows",
        expected="a number in each row",
        remedy="Undo the merging in the workbook, and give each row its number.",
        find=_merged_numbers,
    ),
    Check(
        key="unit_not_stated",
        severity="error",
        meaning="A heading speaks of a unit other than one, and it is not said what its figures "
        "are to be multiplied by.",
        found="a heading that suggests figures to be multiplied by {unit}",
        expected="the multiplier of {number}: {unit}, or 1 if the figures are as they stand",
        remedy="Say in the mapping what the figures are to be multiplied by.",
        find=_unit_not_stated,
    ),
    Check(
        key="bad_unit",
        severity="error",
        meaning="A multiplier of the mapping is no number above zero, or for no number of a file.",
        found="“{text}” as the multiplier of {number}",
        expected="a number such as 1000, 0.001 or 1/1000",
        remedy="Correct the mapping.",
        find=_bad_unit,
    ),
    Check(
        key="rate_kind_not_stated",
        severity="error",
        meaning="Death rates and probabilities of dying are different numbers, and it is not said "
        "which of them the file holds.",
        found="“{text}” as the kind of rate",
        expected="rate (deaths per person-year) or probability (of those who reach an age, the "
        "share who die in it)",
        remedy="Say in the mapping which of the two it is.",
        find=_rate_kind,
    ),
    Check(
        key="bad_population_kind",
        severity="error",
        meaning="The mapping dates the population in a way that is not known.",
        found="“{text}” as the kind of population",
        expected="january (people on 1 January of each year), or nothing",
        remedy="Correct the mapping.",
        find=_population_kind,
    ),
)


def problems_of(mapped: Mapped) -> list[Problem]:
    return [problem for check in CHECKS for problem in check.problems(mapped, mapped.file.name)]


def problems_of_list(mapped: Mapped) -> list[Problem]:
    """Of a small table, whose columns are known by their headings alone."""
    return DOUBLED.problems(mapped, mapped.file.name)
