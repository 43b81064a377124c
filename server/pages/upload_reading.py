"""How the files of an upload are read, shown for correction, and what is asked about the counts."""

from dataclasses import dataclass, replace
from typing import ClassVar

from server.exports.table import Column, Row, Table
from server.intake.mapping import Mapping
from server.intake.reading import Reading, read
from server.intake.recognising.columns import Recognition, fields_of, recognise
from server.pages.page import Frame, Page
from server.pages.upload import locator
from server.sentences import reading as say
from server.sentences.numbers import whole
from server.sentences.pieces import phrase
from server.sentences.text import _
from server.store import collections, editions, uploads
from server.store.connect import Session
from server.store.errors import Refused
from server.store.records import Basis, Upload, UploadFile

UNSTATED = Basis("", "", "", "", "")


@dataclass(frozen=True, slots=True)
class FieldChoice:
    """One thing a column can hold, and which column is taken for it."""

    name: str  # in the form: deaths.year
    label: str
    columns: say.Options
    chosen: str
    why: str


@dataclass(frozen=True, slots=True)
class FileReading:
    """One file: its first rows are the table `key` of the page."""

    key: str
    line: str
    problems: tuple[str, ...]  # what keeps it from being read at all
    fields: tuple[FieldChoice, ...]
    unused: str


@dataclass(frozen=True, slots=True)
class Asked:
    """What no column says, as far as it is known; the options of what can be chosen."""

    mapping: Mapping
    area_hint: str
    sex_codes: tuple[tuple[str, str, str], ...]  # name in the form, label, text in the file
    delivered: str
    provisional: str
    sexes: say.Options
    basis: Basis
    people: say.Options
    dated_by: say.Options
    population: say.Options


@dataclass(frozen=True, slots=True, kw_only=True)
class UploadReadingPage(Page):
    """Is each column what it is taken for, and how were the counts made?"""

    template: ClassVar[str] = "upload_reading/page.html"
    place: str
    collection: str  # code
    readable: bool  # all files are tables, so that there is something to ask
    files: tuple[FileReading, ...]
    asked: Asked


def build(session: Session, upload_id: int) -> UploadReadingPage:
    upload = uploads.find(session, upload_id)
    _require_draft(upload)
    looked = [
        (file, read(uploads.file_bytes(session, upload.id, file.role), file.name))
        for file in upload.files
    ]
    before = _before(session, upload)
    known = [_known(file, reading, before) for file, reading in looked]
    standing = editions.newest_standing(session, upload.collection)
    collection = collections.find(session, upload.collection)
    unreadable = [file.name for file, reading in looked if reading.problems]
    return UploadReadingPage(
        frame=Frame(
            title=_("How the files are read"),
            address=f"/uploads/{upload.id}/reading",
            locator=locator(upload, collection, phrase(_("mapping"))),
            shown=_("Not an edition"),
            nav="upload",
        ),
        answer=say.unreadable(unreadable) if unreadable else say.answer(len(upload.files)),
        tables=tuple(_rows(file, reading) for file, reading in looked),
        place=f"/uploads/{upload.id}",
        collection=collection.code,
        readable=not unreadable,
        files=tuple(
            _file(file, reading, mapping)
            for (file, reading), mapping in zip(looked, known, strict=True)
        ),
        asked=_asked(known, upload.basis or (standing.basis if standing else UNSTATED)),
    )


def _require_draft(upload: Upload) -> None:
    if upload.edition is not None:
        raise Refused(
            "Upload {upload} has become edition {edition} and stays as it is. "
            "Hand the corrected file in as a new upload.",
            upload=upload.id,
            edition=upload.edition,
        )


def _before(session: Session, upload: Upload) -> dict[str, Mapping]:
    """How files of each role were read in the last upload that became an edition."""
    earlier = uploads.listing(session, upload.collection)
    last = next((one for one in earlier if one.edition is not None), None)
    return {file.role: Mapping.from_json(file.mapping) for file in last.files} if last else {}


def _known(file: UploadFile, reading: Reading, before: dict[str, Mapping]) -> Mapping:
    """As stated for this file; else as for the last one, where it has the same columns; else as its
    headings and values suggest."""
    if file.mapping:
        return Mapping.from_json(file.mapping)
    last = before.get(file.role)
    if last is not None:
        columns = {last.column(field) for field in fields_of(file.role)} - {""}
        if columns <= set(reading.columns):
            return replace(last, provisional_years=())
    return recognise(reading, file.role).mapping


def _rows(file: UploadFile, reading: Reading) -> Table:
    """The first rows as they stand in the file."""
    width = len(reading.columns)
    rows = [(*row[:width], *[""] * (width - len(row))) for row in reading.rows]
    return Table(
        file.role,
        _("First rows of {file}", file=file.name),
        tuple(Column(f"column_{at}", name) for at, name in enumerate(reading.columns)),
        tuple(Row(tuple(row)) for row in rows),
    )


def _file(file: UploadFile, reading: Reading, mapping: Mapping) -> FileReading:
    found = recognise(reading, file.role)
    columns = tuple(dict.fromkeys(reading.columns))
    options = (("", say.not_found()), *((column, column) for column in columns))
    chosen = {field: mapping.column(field) for field in fields_of(file.role)}
    return FileReading(
        key=file.role,
        line=say.file_line(
            file.role, file.name, reading.row_count, reading.delimiter_name, reading.encoding
        ),
        problems=tuple(problem.sentence(_, whole) for problem in reading.problems),
        fields=tuple(
            FieldChoice(
                name=f"{file.role}.{field}",
                label=say.field(field),
                columns=options,
                chosen=column if column in columns else "",
                why=_why(found, field, column),
            )
            for field, column in chosen.items()
        ),
        unused=say.unused(
            [(one.column, one.why) for one in found.columns if one.column not in chosen.values()]
        ),
    )


def _why(found: Recognition, field: str, column: str) -> str:
    """How sure the choice of a column is; empty where none was chosen."""
    if not column:
        return ""
    for one in found.columns:
        if (one.column, one.field) == (column, field):
            return say.confidence(one.confidence, one.why)
    return say.confidence("kept", "")


def _asked(known: list[Mapping], basis: Basis) -> Asked:
    """What no column says is the same for all files of an upload."""
    mapping = known[0]
    own = {sex: text for text, sex in mapping.sex_codes}
    without = any(not (one.area or one.area_name) for one in known)
    return Asked(
        mapping=mapping,
        area_hint=say.area_hint(without=without),
        sex_codes=(
            ("code_f", _("Women are written as"), own.get("f", "")),
            ("code_m", _("Men are written as"), own.get("m", "")),
            ("code_p", _("Both together are written as"), own.get("p", "")),
        ),
        delivered=", ".join(mapping.delivered),
        provisional=", ".join(mapping.provisional_years),
        sexes=say.sexes(),
        basis=basis,
        people=say.people(),
        dated_by=say.dated_by(),
        population=say.population(),
    )
