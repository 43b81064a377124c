"""Which column is which, by its heading first and by its values second."""

import re
from collections.abc import Callable
from dataclasses import dataclass

from server.intake.areas import is_code
from server.intake.labels import read_age, read_sex, read_status, read_year
from server.intake.mapping import COLUMNS, NUMBERS, ROLES, Mapping, numbers_of
from server.intake.reading import Reading

# headings as compared: lower case, every run of other signs than letters and digits one space
HEADINGS = {
    "year": "year|period|calendar year|year of death|time",
    "sex": "sex|gender",
    "age": "age|age group|agegroup|ages|age class|age at death|age years",
    "area": "area|area code|region|region code|district|district code|code|geography",
    "area_name": "area name|region name|district name|name|area label",
    "deaths": "deaths|death|died|number of deaths|death count|deaths count",
    "population": "population|person years|personyears|pop|exposure|mid year population|"
    "midyear population|population at risk",
    "births": "births|live births|livebirths|number of births",
    "stillbirths": "stillbirths|still births|stillborn|number of stillbirths|late fetal deaths",
    "neonatal_deaths": "neonatal deaths|neonatal|deaths under 28 days|deaths before 28 days",
    "status": "status|state of the figures",
}
COUNTS = ("count", "number", "n", "value", "total")  # name a number without saying of what
RATES = ("rate", "ratio", "per 1000", "percent", "mx", "qx", "probability")

BY_HEADING = "its heading says so"
BY_VALUES = "its values look like it"
ONLY_NUMBER = "it is the only column of numbers left"
RATE = "a rate: rates are worked out from the counts"
TAKEN = "another column was taken for the same"
NOT_NEEDED = "nothing in this kind of file needs it"
OTHER_COUNT = "another kind of count than this file was handed in for"
UNKNOWN = "neither its heading nor its values are known"


@dataclass(frozen=True, slots=True)
class Recognised:
    """What one column was taken for. The texts are texts of the catalogue."""

    column: str
    field: str  # a field of the mapping; empty: the column is not used
    confidence: str  # "sure", "likely", "not used"
    why: str


@dataclass(frozen=True, slots=True)
class Recognition:
    mapping: Mapping
    columns: tuple[Recognised, ...]  # in the order of the file


def _plain(heading: str) -> str:
    return " ".join(re.split(r"[^0-9a-z]+", heading.casefold())).strip()


def _all(test: Callable[[str], object]) -> Callable[[tuple[str, ...]], bool]:
    return lambda values: bool(values) and all(test(value) for value in values)


def _number(value: str) -> bool:
    return re.fullmatch(r"\d+(\.\d+)?", value) is not None


_LOOKS = {
    "year": _all(read_year),
    "sex": _all(read_sex),
    "status": _all(read_status),
    "age": _all(lambda value: read_age(value) and not _number(value)),
}


def fields_of(role: str) -> tuple[str, ...]:
    """The fields a file of this role may fill."""
    numbers = set(NUMBERS) - set(numbers_of(role))
    skipped = numbers | ({"age"} if role == "births" else set())
    return tuple(field for field in COLUMNS if field not in skipped)


def recognise(reading: Reading, role: str) -> Recognition:
    """Take each column for a field of the mapping, or for none, and say why.

    Raises: ValueError where there is no such role.
    """
    if role not in ROLES:
        raise ValueError(f"no role {role!r}; a file is one of {', '.join(ROLES)}")
    fields = fields_of(role)
    found: dict[str, Recognised] = {}
    for column in dict.fromkeys(reading.columns):
        field = _by_heading(column, fields)
        if field in {known.field for known in found.values()}:
            found[column] = Recognised(column, "", "not used", TAKEN)
        elif field:
            found[column] = Recognised(column, field, "sure", BY_HEADING)
    _names_are_no_codes(reading, found)
    for column in dict.fromkeys(reading.columns):
        if column not in found and (rest := _by_values(column, reading, fields, found)):
            found[column] = rest
    _last_number(reading, role, found)
    columns = tuple(
        found.get(column) or _unused(column, fields) for column in dict.fromkeys(reading.columns)
    )
    taken = {known.field: known.column for known in columns if known.field}
    return Recognition(Mapping(**taken), columns)  # type: ignore[arg-type]


def _by_heading(column: str, fields: tuple[str, ...]) -> str:
    heading = _plain(column)
    return next((field for field in fields if heading in HEADINGS[field].split("|")), "")


def _by_values(
    column: str, reading: Reading, fields: tuple[str, ...], found: dict[str, Recognised]
) -> Recognised | None:
    taken = {known.field for known in found.values()}
    for field, looks in _LOOKS.items():
        if field in fields and field not in taken and looks(reading.values(column)):
            return Recognised(column, field, "likely", BY_VALUES)
    return None


def _last_number(reading: Reading, role: str, found: dict[str, Recognised]) -> None:
    """A file of one kind of number may call it anything, if nothing else is a number."""
    wanted = [
        field for field in ROLES[role] if field not in {known.field for known in found.values()}
    ]
    numbers = [
        column
        for column in reading.columns
        if column not in found
        and not _is_rate(column)
        and not _by_heading(column, COLUMNS)  # it says itself that it is something else
        and _all(_number)(reading.values(column))
    ]
    named = [column for column in numbers if _plain(column) in COUNTS] or numbers
    if len(wanted) == 1 and len(named) == 1:
        found[named[0]] = Recognised(named[0], wanted[0], "likely", ONLY_NUMBER)


def _is_rate(column: str) -> bool:
    heading = f" {_plain(column)} "
    return any(f" {word} " in heading for word in RATES)


def _unused(column: str, fields: tuple[str, ...]) -> Recognised:
    says = _by_heading(column, COLUMNS)
    if _is_rate(column):
        why = RATE
    elif says in ("", *fields):
        why = UNKNOWN
    else:
        why = OTHER_COUNT if says in NUMBERS else NOT_NEEDED
    return Recognised(column, "", "not used", why)


def _names_are_no_codes(reading: Reading, found: dict[str, Recognised]) -> None:
    """A column headed as codes whose values cannot be codes holds names."""
    fields = {known.field: column for column, known in found.items()}
    if "area" not in fields or "area_name" in fields:
        return
    column = fields["area"]
    if not all(is_code(value) for value in reading.values(column)):
        found[column] = Recognised(column, "area_name", "likely", BY_VALUES)
