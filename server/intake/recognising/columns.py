"""Which column is which, by its heading first and by its values second."""

from collections.abc import Callable
from dataclasses import dataclass, replace

from server.intake.areas import is_code
from server.intake.labels import read_age, read_sex, read_status, read_year
from server.intake.mapping import COLUMNS, NUMBERS, OF_CAUSES, ROLES, Mapping, numbers_of
from server.intake.reading import Reading
from server.intake.recognising.across import Across, every_across, number_of
from server.intake.recognising.causes import are_causes, is_cause
from server.intake.recognising.marks import is_number
from server.intake.recognising.names import is_count, is_rate, named, suggests

BY_HEADING = "its heading says so"
IN_HEADING = "its heading speaks of it"
BY_VALUES = "its values look like it"
ONLY_NUMBER = "it is the only column of numbers left"
RATE = "a rate: rates are worked out from the counts"
TAKEN = "another column was taken for the same"
NOT_NEEDED = "nothing in this kind of file needs it"
ACROSS = "its heading stands for an age, a sex or a year"
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


MOSTLY = 0.6  # share of the first values of a column of counts that are numbers: some are withheld


def _all(test: Callable[[str], object]) -> Callable[[tuple[str, ...]], bool]:
    return lambda values: bool(values) and all(test(value) for value in values)


def _numbers(values: tuple[str, ...]) -> bool:
    """Whether a column holds counts: gaps and signs for withheld ones may stand among them."""
    filled = [value for value in values if value]
    return bool(filled) and sum(map(is_number, filled)) >= MOSTLY * len(filled)


def _ages(values: tuple[str, ...]) -> bool:
    """Labels of ages; plain numbers only where they count up from 0."""
    if not values or not all(map(read_age, values)):
        return False
    plain = [value for value in values if is_number(value)]
    return len(plain) < len(values) or plain == [str(age) for age in range(len(values))]


_LOOKS = {
    "year": _all(read_year),
    "sex": _all(read_sex),
    "status": _all(read_status),
    "age": _ages,
}


def fields_of(role: str) -> tuple[str, ...]:
    """The fields a file of this role may fill."""
    numbers = set(NUMBERS) - set(numbers_of(role))
    skipped = numbers | ({"age"} if role == "births" else set())
    skipped |= set() if role in OF_CAUSES else {"cause"}
    return tuple(field for field in COLUMNS if field not in skipped)


def recognise(reading: Reading, role: str, wide: tuple[str, ...] | None = None) -> Recognition:
    """Take each column for a field of the mapping, or for none, and say why.

    `wide` names the fields that stand in headings, () where none do, None to find out.
    Raises: ValueError where there is no such role.
    """
    if role not in ROLES:
        raise ValueError(f"no role {role!r}; a file is one of {', '.join(ROLES)}")
    across = stands(reading, role, wide)
    found = {column: Recognised(column, "", "likely", ACROSS) for column, *_ in across.columns}
    fields = tuple(field for field in fields_of(role) if field not in across.fields)
    names = [column for column in dict.fromkeys(reading.columns) if column]
    rest = [column for column in names if column not in found]
    said = {column: _by_heading(column, fields, reading.values(column)) for column in rest}
    found |= _once_each({column: known for column, known in said.items() if known})
    _codes_of_causes(reading, fields, found)
    _names_are_no_codes(reading, found)
    for column in rest:
        if column not in found and (known := _by_values(column, reading, fields, found)):
            found[column] = known
    if not across.columns:
        _last_number(reading, role, found)
    columns = tuple(found.get(column) or _unused(column, fields) for column in names)
    taken = {known.field: known.column for known in columns if known.field}
    form = replace(
        reading.form,
        across=across.fields,
        across_columns=across.columns,
        across_number=counted(reading, role, across),
    )
    return Recognition(Mapping(**taken, form=form), columns)  # type: ignore[arg-type]


def ways(reading: Reading) -> tuple[Across, ...]:
    """Every way in which headings of the file can stand for ages, sexes and years."""
    return every_across(reading.columns, lambda column: _numbers(reading.values(column)))


def stands(reading: Reading, role: str, wide: tuple[str, ...] | None) -> Across:
    """The headings that stand for something and hold the counts of this role."""
    found = ways(reading)
    if wide is not None:
        found = tuple(way for way in found if way.fields == wide)
    if not found:
        return Across((), ())
    way = found[0]
    if "number" not in way.fields:
        return way
    place = way.fields.index("number") + 1
    return Across(way.fields, tuple(row for row in way.columns if row[place] in numbers_of(role)))


def counted(reading: Reading, role: str, way: Across) -> str:
    """What the cells of a wide table count, where no heading says it; empty where nothing does."""
    if not way.columns or "number" in way.fields:
        return ""
    if len(ROLES[role]) == 1:
        return ROLES[role][0]
    titles = (" ".join(row) for row in reversed(reading.top))
    said = number_of((reading.form.sheet, *titles, reading.name))
    return said if said in numbers_of(role) else ""


def _by_heading(column: str, fields: tuple[str, ...], values: tuple[str, ...]) -> Recognised | None:
    """By its whole heading, or by a name within it where its values do not speak against that."""
    if field := named(column, fields):
        return Recognised(column, field, "sure", BY_HEADING)
    if is_rate(column):
        return Recognised(column, "rate", "likely", IN_HEADING) if "rate" in fields else None
    field = suggests(column, fields)
    fits = _LOOKS.get(field, _numbers)(values) or not values
    return Recognised(column, field, "likely", IN_HEADING) if field and fits else None


def _by_values(
    column: str, reading: Reading, fields: tuple[str, ...], found: dict[str, Recognised]
) -> Recognised | None:
    taken = {known.field for known in found.values()}
    for field, looks in _LOOKS.items():
        if field in fields and field not in taken and looks(reading.values(column)):
            return Recognised(column, field, "likely", BY_VALUES)
    if "cause" in fields and "cause" not in taken and _causes(reading, column):
        return Recognised(column, "cause", "likely", BY_VALUES)
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
        and not is_rate(column)
        and not named(column, COLUMNS)  # it says itself that it is something else
        and _numbers(reading.values(column))
    ]
    called = [column for column in numbers if is_count(column)] or numbers
    if len(wanted) == 1 and len(called) == 1:
        found[called[0]] = Recognised(called[0], wanted[0], "likely", ONLY_NUMBER)


def _once_each(found: dict[str, Recognised]) -> dict[str, Recognised]:
    """Of two columns for the same field the surer one, else the first, is taken."""
    best: dict[str, str] = {}
    for column in sorted(found, key=lambda column: found[column].confidence != "sure"):
        best.setdefault(found[column].field, column)
    return {
        column: known if best[known.field] == column else Recognised(column, "", "not used", TAKEN)
        for column, known in found.items()
    }


def _unused(column: str, fields: tuple[str, ...]) -> Recognised:
    says = named(column, COLUMNS)
    if is_rate(column):
        why = RATE
    elif says in ("", *fields):
        why = UNKNOWN
    else:
        why = OTHER_COUNT if says in NUMBERS else NOT_NEEDED
    return Recognised(column, "", "not used", why)


def _causes(reading: Reading, column: str) -> bool:
    """Whether a column holds causes; the whole file is read only where its first rows may."""
    first = all(map(is_cause, filter(None, reading.values(column))))
    return first and are_causes(reading.distinct(column))


def _codes_of_causes(
    reading: Reading, fields: tuple[str, ...], found: dict[str, Recognised]
) -> None:
    """A column headed as codes, or names, whose values are causes is no area, nor one too many."""
    if "cause" not in fields or "cause" in {known.field for known in found.values()}:
        return
    for column, known in found.items():
        if known.field in ("area", "area_name", "") and _causes(reading, column):
            found[column] = Recognised(column, "cause", "likely", BY_VALUES)
            return


def _names_are_no_codes(reading: Reading, found: dict[str, Recognised]) -> None:
    """A column headed as codes whose values cannot be codes holds names."""
    fields = {known.field: column for column, known in found.items()}
    if "area" not in fields or "area_name" in fields:
        return
    column = fields["area"]
    if not all(is_code(value) for value in reading.distinct(column)):
        found[column] = Recognised(column, "area_name", "likely", BY_VALUES)
