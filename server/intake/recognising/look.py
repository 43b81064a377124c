"""One file looked at: what is proposed for it, what was said about it, and what is still open."""

from collections.abc import Mapping as Mapped
from collections.abc import Sequence
from dataclasses import dataclass, field, replace

from server.intake.causes.lists import CAUSE_LISTS
from server.intake.causes.placing import by_cause
from server.intake.forms.units import suggested
from server.intake.mapping import COLUMNS, LISTS, Form, Mapping, numbers_of
from server.intake.reading import Reading, proposed, read
from server.intake.recognising.across import Across
from server.intake.recognising.causes import Fallen, fallen
from server.intake.recognising.columns import (
    Recognised,
    counted,
    fields_of,
    recognise,
    stands,
    ways,
)
from server.intake.recognising.kinds import kind
from server.intake.recognising.marks import Marks, marks
from server.intake.recognising.noticing import Noticed, notice, texts_of

NOTHING, PLAIN = Noticed(), Marks()
CUT = ("encoding", "delimiter", "sheet")  # of a form: with another of these all else is new


@dataclass(frozen=True, slots=True)
class Said:
    """What was answered about a file, as far as it was."""

    kind: str = ""  # what it holds; empty: not answered
    form: Form | None = None  # but for what stands across; None: nothing was said yet
    shown: Form | None = None  # the form in which the file was shown when this was said
    marks: bool = False  # how numbers are written was answered
    columns: Mapped[str, str] = field(default_factory=dict)  # by field
    wide: tuple[str, ...] | None = None  # fields that stand in headings
    across_number: str = ""
    units: tuple[tuple[str, str], ...] = ()
    rate_is: str = ""
    sex_codes: tuple[tuple[str, str], ...] = ()
    signs: tuple[tuple[str, str], ...] = ()  # texts in place of numbers, and what they mean
    cause_list: str = ""  # one of CAUSE_LISTS


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
    numbers: tuple[str, ...] = ()  # those that the file holds under this mapping
    units: tuple[tuple[str, str], ...] = ()  # numbers whose unit is asked, and the one proposed
    signs: tuple[str, ...] = ()  # texts in place of numbers, whose meaning is asked
    by_cause: bool = False  # so that its list of causes is asked
    fallen: Fallen | None = None  # how its causes fall into the list that was chosen
    # questions without an answer: kind, marks, signs, units, sexes, number, rate_is, cause_list
    open: tuple[str, ...] = ()
    changed: bool = False  # what was said made another table of it: its columns want a look
    before: Before | None = None  # whose mapping was taken over
    lost: tuple[tuple[str, str], ...] = ()  # of the earlier mapping: fields whose columns are gone


def look(
    content: bytes,
    name: str,
    role: str,
    said: Said | None = None,
    before: Sequence[Before] = (),
) -> Looked:
    """Read a file as was said, else as one of the earlier ones, newest first, whose columns it has,
    else as is likely. Never raises for its content."""
    if said is None:
        return _first(content, name, role, before)
    if said.form is None:
        likely = _first(content, name, role, before)
        if likely.reading.problems or role in LISTS:
            return likely
        form = likely.mapping.form
        return look(content, name, role, replace(said, form=form, shown=form, wide=None))
    form, shown = said.form, said.shown or said.form
    if any(getattr(form, part) != getattr(shown, part) for part in CUT):
        stated = Form(**{part: getattr(form, part) for part in CUT})
        return replace(_recognised(proposed(content, name, stated), role), changed=True)
    reading = read(content, name, form)
    if (form.heading, form.heading_rows) != (shown.heading, shown.heading_rows):
        return replace(_recognised(reading, role), changed=True)
    if role not in LISTS and said.wide is not None and said.wide != shown.across:
        return replace(_recognised(reading, role, said.wide), changed=True)
    if reading.sheets:  # which of its numbers are texts only a reading that proposes tells
        asked = proposed(content, name, Form(sheet=form.sheet)).questions
        reading = replace(reading, questions=asked)
    return _looked(reading, role, _mapped(reading, role, said), said)


def _recognised(reading: Reading, role: str, wide: tuple[str, ...] | None = None) -> Looked:
    """As is likely."""
    if role in LISTS or reading.problems:
        return Looked(role, reading, Mapping(form=reading.form), ())
    found = recognise(reading, role, wide)
    return _looked(reading, role, found.mapping, None)


def _first(content: bytes, name: str, role: str, before: Sequence[Before]) -> Looked:
    """As the newest earlier file that fits was read; where none does, as is likely, and what the
    newest one had that this one lacks."""
    first = _sheet_of(content, name, role)
    if not before or role in LISTS:
        return _recognised(first, role)
    lost = []
    for earlier in before:
        sheet, reading = earlier.mapping.form.sheet, first
        if sheet != first.form.sheet and sheet in {tab.name for tab in first.sheets}:
            reading = proposed(content, name, Form(sheet=sheet))
        missing = _missing(reading, role, earlier.mapping)
        if not missing and not reading.problems:
            return replace(_as_before(reading, role, earlier.mapping), before=earlier)
        lost.append(missing)
    return replace(_recognised(first, role), before=before[0], lost=lost[0])


def _sheet_of(content: bytes, name: str, role: str) -> Reading:
    """The file as proposed; of a workbook the first sheet that holds what the role asks for."""
    first = proposed(content, name, Form())
    shown = [tab.name for tab in first.sheets if not tab.hidden and tab.rows > 1]
    for sheet in shown if len(shown) > 1 else ():
        reading = first if sheet == first.form.sheet else proposed(content, name, Form(sheet=sheet))
        if kind(reading).role == role:
            return reading
    return first


def _missing(reading: Reading, role: str, kept: Mapping) -> tuple[tuple[str, str], ...]:
    """Fields of an earlier mapping whose columns, or whose headings across, are not there."""
    lost = [
        (of, column)
        for of in COLUMNS
        if (column := kept.column(of)) and column not in reading.columns
    ]
    if kept.form.across and not stands(reading, role, kept.form.across).columns:
        lost += [(of, "") for of in kept.form.across]
    return tuple(lost)


def _as_before(reading: Reading, role: str, kept: Mapping) -> Looked:
    """The earlier mapping on this file: its headings across and its marks are looked at anew."""
    likely = recognise(reading, role, kept.form.across)
    form = replace(likely.mapping.form, across_number=kept.form.across_number)
    mapping = replace(kept, form=form, provisional_years=())
    return _looked(reading, role, mapping, None)


def said_in(mapping: Mapping, role: str) -> Said:
    """What a mapping that was stated before says."""
    return Said(
        kind=role,
        form=mapping.form,
        marks=True,
        columns={of: mapping.column(of) for of in COLUMNS},
        wide=mapping.form.across,
        across_number=mapping.form.across_number,
        units=mapping.units,
        rate_is=mapping.rate_is,
        sex_codes=mapping.sex_codes,
        signs=mapping.signs,
        cause_list=mapping.cause_list,
    )


def _mapped(reading: Reading, role: str, said: Said) -> Mapping:
    """What was said, as a mapping."""
    if role in LISTS:
        return Mapping(form=reading.form)
    wide = (said.shown or reading.form).across if said.wide is None else said.wide
    way = stands(reading, role, wide)
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
        signs=said.signs,
        cause_list=said.cause_list if said.cause_list in CAUSE_LISTS else "",
    )


def _looked(reading: Reading, role: str, mapping: Mapping, said: Said | None) -> Looked:
    """What the file holds under this mapping, and which answers are missing."""
    if role in LISTS or reading.problems:
        return Looked(role, reading, mapping, ())
    numbers = _numbers(mapping, role)
    found = _marks(reading, numbers)
    if said is None:
        form = replace(mapping.form, decimal=found.decimal, thousands=found.thousands)
        mapping = replace(mapping, form=form)
    noticed = notice(reading, mapping)
    units = _units(reading, numbers)
    told = {number for number, _ in units}
    stated = tuple(unit for unit in mapping.units if unit[0] in told or unit[1] != "1")
    mapping = replace(mapping, units=stated)
    signs = reading.signs([column for each in numbers.values() for column in each])
    parted = by_cause(role, mapping)
    mapping = replace(mapping, cause_list=mapping.cause_list if parted else "")
    answered = dict(mapping.sex_codes)
    missing = {
        "kind": not (kind(reading).role or (said and said.kind)),
        "marks": not found.sure and not (said and said.marks),
        "signs": bool(set(signs) - dict(mapping.signs).keys()),
        "number": bool(mapping.form.across) and "" in numbers,
        "units": bool(told - {number for number, _ in stated}),
        "rate_is": "rate" in numbers and not mapping.rate_is,
        "cause_list": parted and not mapping.cause_list,
        "sexes": any(code.asked and code.text not in answered for code in noticed.sexes),
    }
    return Looked(
        role=role,
        reading=reading,
        mapping=mapping,
        columns=recognise(reading, role, mapping.form.across).columns,
        ways=ways(reading),
        noticed=noticed,
        marks=found,
        numbers=tuple(number for number in numbers if number),
        units=units,
        signs=signs,
        by_cause=parted,
        fallen=fallen(texts_of(reading, mapping, "cause"), mapping.cause_list) if parted else None,
        open=tuple(question for question, is_open in missing.items() if is_open),
    )


def _marks(reading: Reading, numbers: dict[str, tuple[str, ...]]) -> Marks:
    """How numbers are written, by all texts of their columns; of a workbook by what was asked."""
    if reading.sheets:
        asked = next((one for one in reading.questions if one.key == "decimal"), None)
        if asked is None:
            return PLAIN
        thousands, example = asked.values["thousands"], asked.values["example"]
        return Marks(asked.proposal, thousands, sure=asked.likely, example=example)
    columns = [column for each in numbers.values() for column in each]
    return marks(
        text for column in columns if column in reading.columns for text in reading.distinct(column)
    )


def _numbers(mapping: Mapping, role: str) -> dict[str, tuple[str, ...]]:
    """The columns in which each number stands; "" for cells that nothing says the count of."""
    found: dict[str, tuple[str, ...]] = {
        number: (column,) for number in numbers_of(role) if (column := mapping.column(number))
    }
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
