"""How one file of an upload is read, as lines of a form, with what was found and why."""

from dataclasses import dataclass

from server.exports.table import Column, Row, Table
from server.intake.forms.delimiters import NAMES
from server.intake.forms.encodings import ENCODINGS
from server.intake.mapping import EVERY_ROLE, LISTS, NUMBERS, ROLES, Mapping, numbers_of
from server.intake.recognising.columns import fields_of
from server.intake.recognising.look import Looked
from server.pages.file_causes import cause_lists, fallen, lost
from server.pages.form_fields import Field, select, text
from server.sentences import reading as say
from server.sentences import reading_form as ask
from server.sentences.numbers import as_needed
from server.sentences.text import _
from server.store.records import UploadFile

SAMPLES = 3  # values of a column shown beside its name


@dataclass(frozen=True, slots=True)
class FileReading:
    """One file: its first rows are the table `key` of the page."""

    key: str
    line: str
    notes: tuple[str, ...]  # remembered, changed: to be read before anything else
    problems: tuple[str, ...]  # what keeps it from being read at all
    kind: Field  # what it holds
    form: tuple[Field, ...]  # how the table stands in the file
    form_open: bool  # some of that is a guess
    sent: tuple[tuple[str, str], ...]  # goes along unseen: the form it is shown in, texts of sexes
    asked: tuple[Field, ...]  # what the file does not say by itself
    causes: str  # key of the table of how its causes fall into their list; empty: there is none
    fallen: str  # the same in a sentence
    lost: str  # causes that are not in the list
    columns: tuple[Field, ...]
    others: tuple[Field, ...]  # fields that no column was found for and none is needed
    found: str  # sums among the rows
    unused: str


def file_reading(file: UploadFile, looked: Looked, errors: dict[str, str]) -> FileReading:
    """The lines of the form about one file; `errors` by the names of its fields."""
    role, reading = file.role, looked.reading
    main, others = ([], []) if reading.problems or role in LISTS else _columns(looked)
    asked = [] if reading.problems or role in LISTS else _asked(looked)
    return FileReading(
        key=role,
        line=say.file_line(
            role,
            reading.name,
            reading.row_count,
            "" if reading.sheets else reading.delimiter_name,
            reading.encoding,
        ),
        notes=_notes(looked),
        problems=tuple(problem.sentence(_, as_needed) for problem in reading.problems),
        kind=_kind(looked).wrong(errors),
        form=tuple(field.wrong(errors) for field in _form(looked)),
        form_open=bool(
            _guessed(looked)
            or reading.problems
            or "kind" in looked.open
            or any(field.name in errors for field in _form(looked))
        ),
        sent=_sent(looked),
        asked=tuple(field.wrong(errors) for field in asked),
        causes=f"{role}_causes" if looked.fallen else "",
        fallen=fallen(looked),
        lost=lost(looked),
        columns=tuple(main),
        others=tuple(others),
        found=ask.totals(looked.noticed.totals),
        unused=_unused(looked),
    )


def _kind(looked: Looked) -> Field:
    """What it holds: nothing is chosen beforehand where nothing tells."""
    name, kinds = f"{looked.role}.role", ask.kinds(EVERY_ROLE)
    if "kind" in looked.open:
        options = (ask.choose(), *kinds)
        hint = _("neither its columns nor its name tell")
        return select(name, _("It holds"), options, "", width="wide", hint=hint, required=True)
    return select(name, _("It holds"), kinds, looked.role, width="wide")


def _sent(looked: Looked) -> tuple[tuple[str, str], ...]:
    """What comes back with the answers, so that they are known to be about what was shown."""
    role = looked.role
    return (
        (f"{role}.shown", Mapping(form=looked.mapping.form).to_json()),
        *(
            (f"{role}.sex_text.{place}", code.text)
            for place, code in enumerate(looked.noticed.sexes)
        ),
        *((f"{role}.sign_text.{place}", sign) for place, sign in enumerate(looked.signs)),
    )


def open_questions(looked: Looked) -> tuple[str, ...]:
    """What the file does not say by itself and nothing is chosen for yet."""
    sexes = tuple(code.text for code in looked.noticed.sexes if code.asked)
    return tuple(ask.question(one, sexes, looked.signs) for one in looked.open)


def sample(looked: Looked) -> Table:
    """The first rows as they stand in the file."""
    reading = looked.reading
    width = len(reading.columns)
    rows = [(*row[:width], *[""] * (width - len(row))) for row in reading.rows]
    return Table(
        looked.role,
        _("First rows of {file}", file=reading.name),
        tuple(Column(f"column_{at}", name) for at, name in enumerate(reading.columns)),
        tuple(Row(tuple(row)) for row in rows),
    )


def _notes(looked: Looked) -> tuple[str, ...]:
    notes = [ask.changed()] if looked.changed else []
    if looked.before and looked.lost:
        notes.append(ask.lost(looked.before.edition, looked.lost))
    elif looked.before:
        notes.append(ask.as_before(looked.before.edition))
    return tuple(notes)


def _guessed(looked: Looked) -> set[str]:
    reading = looked.reading
    parts = {"heading"} | ({"sheet"} if len(reading.sheets) > 1 else set())
    parts |= set() if reading.sheets else {"encoding", "delimiter"}
    return parts - set(reading.sure)


def _form(looked: Looked) -> list[Field]:
    """Sheet or signs, the rows of the headings, and how numbers are written if that is no
    question."""
    role, reading, form = looked.role, looked.reading, looked.reading.form
    fields = []
    if len(reading.sheets) > 1:
        tabs = [(tab.name, ask.sheet(tab.name, tab.rows, tab.columns)) for tab in reading.sheets]
        fields.append(select(f"{role}.sheet", _("Sheet"), tuple(tabs), form.sheet, width="wide"))
    if not reading.sheets:
        signs = ask.delimiters(tuple(NAMES.values()))
        encodings = ask.encodings(ENCODINGS)
        fields += [
            select(f"{role}.encoding", _("Encoding"), encodings, form.encoding),
            select(
                f"{role}.delimiter",
                _("Columns are parted by"),
                signs,
                NAMES.get(form.delimiter, ""),
            ),
        ]
    fields += [
        text(f"{role}.heading", _("Headings begin in row"), str(form.heading)),
        select(
            f"{role}.heading_rows",
            _("Headings take"),
            ask.heading_rows(),
            str(form.heading_rows),
        ),
    ]
    if not looked.marks.example:
        fields.append(_marks(looked))
    return fields


def _marks(looked: Looked) -> Field:
    """How numbers are written; nothing is chosen beforehand where they can be read in two ways."""
    found, form, name = looked.marks, looked.mapping.form, f"{looked.role}.marks"
    options = ask.marks()
    if not found.example:
        code = ask.marks_code(form.decimal, form.thousands)
        return select(name, _("Numbers are written as"), options, code, width="wide")
    likely = ask.marks_example(found.decimal, found.thousands)
    return select(
        name,
        _("Numbers are written as"),
        (ask.choose(), *options),
        "" if "marks" in looked.open else ask.marks_code(form.decimal, form.thousands),
        hint=ask.marks_hint(found.example, sure=found.sure, proposed=likely),
        width="whole",
        required=True,
    )


def _asked(looked: Looked) -> list[Field]:
    """What the file does not say by itself, each with what is likely."""
    role, mapping, form = looked.role, looked.mapping, looked.mapping.form
    fields = []
    if looked.marks.example:
        fields.append(_marks(looked))
    if looked.ways:
        shapes = [
            ("-".join(way.fields), ask.shape(way.fields, len(way.columns))) for way in looked.ways
        ]
        chosen = "-".join(form.across) or ask.LONG
        options = (*shapes, (ask.LONG, ask.shape((), 0)))
        fields.append(select(f"{role}.wide", _("The table is"), options, chosen, width="wide"))
    if form.across and "number" not in form.across and len(ROLES[role]) > 1:
        numbers = tuple((number, say.field(number)) for number in numbers_of(role))
        options = (ask.choose(), *numbers)
        name = f"{role}.across_number"
        fields.append(select(name, ask.number_label(), options, form.across_number, required=True))
    fields += _units(looked)
    if mapping.rate or form.across_number == "rate":
        name = f"{role}.rate_is"
        kinds = ask.rate_kinds()
        label = _("These are")
        fields.append(select(name, label, kinds, mapping.rate_is, width="wide", required=True))
    return fields + _signs(looked) + _sexes(looked) + cause_lists(looked)


def _units(looked: Looked) -> list[Field]:
    """The unit of each number: to be chosen where a heading or title speaks of one."""
    role, mapping = looked.role, looked.mapping
    proposals, stated = dict(looked.units), dict(mapping.units)
    fields = []
    for number in looked.numbers:
        options = ask.units()
        proposal = proposals.get(number, "")
        if proposal:
            options = (ask.choose(), *options)
        fields.append(
            select(
                f"{role}.unit.{number}",
                ask.unit_label(number),
                options,
                stated.get(number, "" if proposal else "1"),
                hint=ask.unit_hint(proposal) if proposal else "",
                required=bool(proposal),
            )
        )
    return fields


def _signs(looked: Looked) -> list[Field]:
    """What stands where a number belongs: nothing is chosen beforehand."""
    stated = dict(looked.mapping.signs)
    return [
        select(
            f"{looked.role}.sign.{place}",
            ask.sign_label(sign),
            ask.sign_meanings(),
            stated.get(sign, ""),
            hint=ask.sign_hint(),
            width="whole",
            required=True,
        )
        for place, sign in enumerate(looked.signs)
    ]


def _sexes(looked: Looked) -> list[Field]:
    stated = dict(looked.mapping.sex_codes)
    return [
        select(
            f"{looked.role}.sex.{place}",
            ask.sex_label(code.text),
            ask.sex_meanings(),
            stated.get(code.text, ""),
            hint=ask.sex_hint(code.likely, asked=code.asked),
            required=code.asked,
        )
        for place, code in enumerate(looked.noticed.sexes)
    ]


def _columns(looked: Looked) -> tuple[list[Field], list[Field]]:
    """A choice of column for each field: those found or needed, and the rest."""
    reading, mapping = looked.reading, looked.mapping
    names = [column for column in dict.fromkeys(reading.columns) if column]
    columns = (("", say.not_found()), *((column, column) for column in names))
    why = {(one.column, one.field): one for one in looked.columns}
    needed = {"year", "age", "sex", *ROLES[looked.role]}
    main: list[Field] = []
    rest: list[Field] = []
    for field in fields_of(looked.role):
        if field in mapping.form.across:
            continue
        chosen = mapping.column(field)
        hint = ""
        if chosen:
            known = why.get((chosen, field))
            level, reason = (known.confidence, known.why) if known else ("kept", "")
            hint = say.column_hint(say.confidence(level, reason), _values(looked, field, chosen))
        line = select(f"{looked.role}.{field}", say.field(field), columns, chosen, hint=hint)
        (main if chosen or (field in needed and not mapping.form.across) else rest).append(line)
    return main, rest


def _values(looked: Looked, field: str, column: str) -> tuple[str, ...]:
    """A few different values of a column; of words those of the whole file."""
    reading = looked.reading
    if column not in reading.columns:
        return ()
    values = reading.values(column) if field in NUMBERS else reading.distinct(column)
    return tuple(filter(None, dict.fromkeys(values)))[:SAMPLES]


def _unused(looked: Looked) -> str:
    if looked.role in LISTS:
        return ""
    taken = {looked.mapping.column(field) for field in fields_of(looked.role)}
    taken |= {row[0] for row in looked.mapping.form.across_columns}
    return say.unused([(one.column, one.why) for one in looked.columns if one.column not in taken])
