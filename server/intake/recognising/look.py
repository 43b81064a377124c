"""One file looked at: what is proposed for it, what was said about it, and what is still open."""

from collections.abc import Mapping as Mapped
from dataclasses import dataclass, field, replace

from server.intake.forms.units import suggested
from server.intake.mapping import COLUMNS, LISTS, Form, Mapping, numbers_of
from server.intake.reading import Reading, proposed, read
from server.intake.recognising.across import Across
from server.intake.recognising.columns import (
    Recognised,
    counted,
    fields_of,
    recognise,
    stands,
    ways,
)
from server.intake.recognising.marks import Marks, marks
from server.intake.recognising.noticing import Noticed, notice

NOTHING, PLAIN = Noticed(), Marks()
CUT = ("encoding", "delimiter", "sheet")  # of a form: with another of these all else is new


@dataclass(frozen=True, slots=True)
class Said:
    """What was answered about a file, as far as it was."""

    form: Form | None = None  # but for what stands across; None: nothing was said yet
    shown: Form | None = None  # the form in which the file was shown when this was said
    marks: bool = True  # how numbers are written was answered
    columns: Mapped[str, str] = field(default_factory=dict)  # by field
    wide: tuple[str, ...] | None = None  # fields that stand in headings
    across_number: str = ""
    units: tuple[tuple[str, str], ...] = ()
    rate_is: str = ""
    sex_codes: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True)
class Before:
    """How a file of the same role was read for an earlier upload of the collection."""

    edition: int  # 0: it became none
    mapping: Mapping


@dataclass(frozen=True, slots=True)
class Looked:
    """`mapping` holds what concerns this file; what holds for all files is added to it."""

    role: str
    reading: Reading
    mapping: Mapping
    columns: tuple[Recognised, ...]
    ways: tuple[Across, ...] = ()
    noticed: Noticed = NOTHING
    marks: Marks = PLAIN
    units: tuple[tuple[str, str], ...] = ()  # numbers whose unit is asked, and the one proposed
    open: tuple[str, ...] = ()  # questions without an answer: marks, units, sexes, number, rate_is
    changed: bool = False  # what was said made another table of it: its columns want a look
    before: Before | None = None  # whose mapping was taken over
    lost: tuple[tuple[str, str], ...] = ()  # of the earlier mapping: fields whose columns are gone


def look(
    content: bytes, name: str, role: str, said: Said | None = None, before: Before | None = None
) -> Looked:
    """Read a file as was said, else as before, else as is likely. Never raises for its content."""
    if said is None or said.form is None:
        if before is not None and role not in LISTS:
            return _as_before(content, name, role, before)
        return _recognised(proposed(content, name, Form()), role)
    shown = said.shown or said.form
    if any(getattr(said.form, part) != getattr(shown, part) for part in CUT):
        stated = Form(**{part: getattr(said.form, part) for part in CUT})
        return replace(_recognised(proposed(content, name, stated), role), changed=True)
    reading = read(content, name, said.form)
    rows = (said.form.heading, said.form.heading_rows)
    if rows != (shown.heading, shown.heading_rows):
        return replace(_recognised(reading, role), changed=True)
    if role not in LISTS and said.wide is not None and said.wide != shown.across:
        return replace(_recognised(reading, role, said.wide), changed=True)
    return _looked(reading, role, _mapped(reading, role, said), said)


def _recognised(reading: Reading, role: str, wide: tuple[str, ...] | None = None) -> Looked:
    """As is likely."""
    if role in LISTS or reading.problems:
        return Looked(role, reading, Mapping(form=reading.form), ())
    found = recognise(reading, role, wide)
    return _looked(reading, role, found.mapping, None)


def _as_before(content: bytes, name: str, role: str, before: Before) -> Looked:
    """As an earlier file of the role was read, where this one has the columns for it."""
    kept = before.mapping
    reading = proposed(content, name, Form())
    if kept.form.sheet in {tab.name for tab in reading.sheets}:
        reading = proposed(content, name, Form(sheet=kept.form.sheet))
    likely = _recognised(reading, role)
    lost = [
        (of, column)
        for of in COLUMNS
        if (column := kept.column(of)) and column not in reading.columns
    ]
    way = stands(reading, role, kept.form.across) if kept.form.across else Across((), ())
    if kept.form.across and not way.columns:
        lost += [(of, "") for of in kept.form.across]
    if lost or reading.problems:
        return replace(likely, before=before, lost=tuple(lost))
    form = replace(
        likely.mapping.form,
        across=way.fields,
        across_columns=way.columns,
        across_number=kept.form.across_number,
    )
    mapping = replace(kept, form=form, provisional_years=())
    looked = _looked(reading, role, mapping, Said(marks=likely.marks.sure))
    return replace(looked, before=before)


def _mapped(reading: Reading, role: str, said: Said) -> Mapping:
    """What was said, as a mapping."""
    way = stands(reading, role, said.wide or ()) if role not in LISTS else Across((), ())
    form = replace(
        reading.form,
        across=way.fields,
        across_columns=way.columns,
        across_number=counted(reading, role, way) or said.across_number,
    )
    columns = {of: column for of, column in said.columns.items() if of in fields_of(role)}
    return Mapping(
        **columns,  # type: ignore[arg-type]
        form=form,
        units=said.units,
        rate_is=said.rate_is,
        sex_codes=said.sex_codes,
    )


def _looked(reading: Reading, role: str, mapping: Mapping, said: Said | None) -> Looked:
    """What the file holds under this mapping, and which answers are missing."""
    if role in LISTS or reading.problems:
        return Looked(role, reading, mapping, ())
    numbers = _numbers(mapping, role)
    found = marks(
        text
        for columns in numbers.values()
        for column in columns
        if column in reading.columns
        for text in reading.distinct(column)
    )
    if said is None:
        form = replace(mapping.form, decimal=found.decimal, thousands=found.thousands)
        mapping = replace(mapping, form=form)
    noticed = notice(reading, mapping)
    units = _units(reading, numbers)
    answered = dict(mapping.sex_codes)
    missing = {
        "marks": not (found.sure if said is None else said.marks),
        "number": bool(mapping.form.across) and "" in numbers,
        "units": bool({number for number, _ in units} - {number for number, _ in mapping.units}),
        "rate_is": "rate" in numbers and not mapping.rate_is,
        "sexes": any(text not in answered for text, _ in noticed.sexes),
    }
    return Looked(
        role=role,
        reading=reading,
        mapping=mapping,
        columns=recognise(reading, role, mapping.form.across).columns,
        ways=ways(reading),
        noticed=noticed,
        marks=found,
        units=units,
        open=tuple(question for question, is_open in missing.items() if is_open),
    )


def _numbers(mapping: Mapping, role: str) -> dict[str, tuple[str, ...]]:
    """The columns in which each number stands; "" for cells that nothing says the count of."""
    found = {number: (column,) for number in numbers_of(role) if (column := mapping.column(number))}
    form = mapping.form
    place = form.across.index("number") + 1 if "number" in form.across else 0
    for row in form.across_columns:
        number = row[place] if place else form.across_number
        found[number] = (*found.get(number, ()), row[0])
    return found


def _units(reading: Reading, numbers: dict[str, tuple[str, ...]]) -> tuple[tuple[str, str], ...]:
    """Numbers whose unit is spoken of, by a heading or, of thousands, by a title of the table."""
    titles = [reading.form.sheet, *(" ".join(row) for row in reading.top)]
    thousands = next((unit for title in titles if (unit := suggested(title)).isdecimal()), "")
    found = []
    for number, columns in numbers.items():
        unit = next((unit for column in columns if (unit := suggested(column))), thousands)
        if number and unit:
            found.append((number, unit))
    return tuple(found)
