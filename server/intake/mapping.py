"""What the columns of a file mean, and what the file does not say itself."""

import json
from dataclasses import asdict, dataclass, fields
from itertools import repeat
from typing import Any

# fields of a mapping that name a column of the file
COLUMNS = (
    "year",
    "sex",
    "age",
    "area",
    "area_name",
    "deaths",
    "population",
    "births",
    "stillbirths",
    "neonatal_deaths",
    "rate",
    "status",
    "cause",
)
OF_CAUSES = ("counts", "deaths")  # roles whose deaths may be by cause

# which numbers a file of each role must carry
ROLES: dict[str, tuple[str, ...]] = {
    "counts": ("deaths", "population"),
    "deaths": ("deaths",),
    "population": ("population",),
    "births": ("births",),
    "rates": ("rate",),
}
# and which it may carry besides
BESIDE: dict[str, tuple[str, ...]] = {
    "births": ("stillbirths", "neonatal_deaths"),
    "rates": ("population",),
}
LISTS = ("areas", "breaks", "causes")  # roles of small tables that hold no counts
EVERY_ROLE = (*ROLES, *LISTS)
WITHOUT_AGE = (*ROLES["births"], *BESIDE["births"])  # counts, not columns, that no age goes with


def numbers_of(role: str) -> tuple[str, ...]:
    """The numbers that a file of this role carries or may carry."""
    return (*ROLES[role], *BESIDE.get(role, ()))


NUMBERS = tuple(dict.fromkeys(number for role in ROLES for number in numbers_of(role)))


RATE_KINDS = ("rate", "probability")  # deaths per person-year; share who die of those who begin
# what a sign in the place of a number may mean; a mistake is told row by row
SIGNS = ("nil", "not_available", "withheld", "mistake")
JANUARY = "january"  # population of 1 January, averaged with that of the next to person-years


@dataclass(frozen=True, slots=True)
class Form:
    """How the table stands in the file. Empty text: as the bytes themselves say."""

    encoding: str = ""
    delimiter: str = ""  # one sign
    sheet: str = ""  # name of the sheet of a workbook
    heading: int = 1  # row of the file in which the headings begin
    heading_rows: int = 1  # rows that make up the headings, joined by a blank from above
    decimal: str = "."  # or ","
    thousands: str = ""  # sign between thousands
    # fields whose values stand in headings: of age, sex, year, and number (which count it is)
    across: tuple[str, ...] = ()
    # a heading and its value in each of those fields, in their order
    across_columns: tuple[tuple[str, ...], ...] = ()
    across_number: str = ""  # the count in those cells, where no heading says it


@dataclass(frozen=True, slots=True)
class Mapping:
    """How one file is to be read. Empty text: not given."""

    # names of columns in the file
    year: str = ""
    sex: str = ""
    age: str = ""
    area: str = ""  # column of area codes
    area_name: str = ""  # column of names; without a column of codes, codes are made from them
    deaths: str = ""
    population: str = ""
    births: str = ""  # live births
    stillbirths: str = ""
    neonatal_deaths: str = ""  # deaths before 28 days, of those counted at age 0
    rate: str = ""  # death rates or probabilities of dying
    status: str = ""  # column that says provisional or final
    cause: str = ""  # column of causes of death: codes, or codes and labels of the list

    # what stands in no column
    only_area: str = ""  # code of the one area of a file without an area column
    only_area_name: str = ""
    only_sex: str = ""  # f, m or p of a file without a sex column
    whole: str = ""  # code of the area that all others are parts of
    whole_name: str = ""
    delivered: tuple[str, ...] = ()  # codes of areas kept as delivered, not summed from their parts
    sex_codes: tuple[tuple[str, str], ...] = ()  # text in the file and f, m or p
    last_age_open: bool = False  # the last age of each series is open though it is not marked
    provisional_years: tuple[str, ...] = ()
    rate_is: str = ""  # one of RATE_KINDS
    population_is: str = ""  # JANUARY, or empty: people at risk as they stand
    # a number and what each of its figures is to be multiplied by: ("population", "1000")
    units: tuple[tuple[str, str], ...] = ()
    # texts that stand where numbers belong, and which of SIGNS each one is
    signs: tuple[tuple[str, str], ...] = ()
    # of sex, age and area: what is done with counts that do not state it, "spread" or "left_out"
    unstated: tuple[tuple[str, str], ...] = ()
    cause_list: str = ""  # one of CAUSE_LISTS, where the deaths are by cause
    most_unstated: int = 5  # per cent of a year's counts; above, spreading is refused
    form: Form = Form()

    def to_json(self) -> str:
        """Canonical: the same mapping always gives the same text."""
        return json.dumps(asdict(self), sort_keys=True, ensure_ascii=False, separators=(",", ":"))

    @classmethod
    def from_json(cls, text: str) -> "Mapping":
        """Raises: ValueError where a field is unknown or has the wrong shape."""
        stored = json.loads(text)
        if not isinstance(stored, dict):
            raise ValueError(f"a mapping is an object of named fields; found {text[:40]!r}")
        form = Form(**_checked(Form, stored.pop("form", {})))
        return cls(**_checked(cls, stored), form=form)

    def column(self, field: str) -> str:
        """Name of the column mapped to this field; empty where there is none."""
        return str(getattr(self, field))


def _texts(part: Any, name: str) -> str | tuple[str, ...]:
    """A text of a list, or a list of texts in it. Raises: ValueError."""
    inner = part if isinstance(part, list) else [part]
    if not all(isinstance(text, str) for text in inner):
        raise ValueError(f"mapping field {name} holds {part!r}; expected texts")
    return tuple(inner) if isinstance(part, list) else part


def _checked(cls: type[Form] | type[Mapping], stored: Any) -> dict[str, Any]:
    """Stored fields with lists made tuples. Raises: ValueError."""
    if not isinstance(stored, dict):
        raise ValueError(f"a {cls.__name__.casefold()} is an object; found {stored!r}")
    known = {field.name: field.default for field in fields(cls)}
    found = dict(stored)
    for name, value in stored.items():
        if name not in known:
            raise ValueError(
                f"{name!r} is no field of a mapping; the fields are {', '.join(known)}"
            )
        if isinstance(known[name], tuple):
            if not isinstance(value, list):
                raise ValueError(f"mapping field {name} is {value!r}; expected a list")
            found[name] = tuple(map(_texts, value, repeat(name)))
        elif type(value) is not type(known[name]):
            raise ValueError(
                f"mapping field {name} is {value!r}; expected {type(known[name]).__name__}"
            )
    return found
