"""How the files of an upload are read, shown for correction, and what is asked about the counts."""

from collections.abc import Collection
from collections.abc import Mapping as Mapped
from dataclasses import dataclass, field, replace
from typing import Any, ClassVar

from server.intake.mapping import JANUARY, LISTS, Mapping
from server.intake.recognising.look import Before, Looked, Said, look, said_in
from server.pages.file_causes import causes
from server.pages.file_reading import (
    FileReading,
    file_reading,
    open_questions,
    sample,
)
from server.pages.page import Frame, Page
from server.pages.reading_questions import Asked, asked, open_errors
from server.pages.upload import locator
from server.sentences import reading as say
from server.sentences import reading_form as ask
from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _
from server.store import collections, editions, uploads
from server.store.connect import Session
from server.store.errors import Refused
from server.store.records import Basis, Upload

MOST_EARLIER = 5  # editions whose files are tried for what a new one is likely to mean
UNSTATED = Basis("", "", "", "", "")


@dataclass(frozen=True, slots=True)
class Answers:
    """What was sent with the form of this page."""

    files: Mapped[str, Said]  # by role
    texts: Mapped[str, str]  # all fields as they were sent, by name
    shared: Mapped[str, Any]  # fields of every file's mapping
    basis: Basis | None  # None: not all of it is answered
    errors: Mapped[str, str] = field(default_factory=dict)  # by name, of what was not understood


@dataclass(frozen=True, slots=True, kw_only=True)
class UploadReadingPage(Page):
    """Is each column what it is taken for, and how were the counts made?"""

    template: ClassVar[str] = "upload_reading/page.html"
    place: str
    collection: str  # code
    readable: bool  # all files are tables, so that there is something to ask
    files: tuple[FileReading, ...]
    asked: Asked


def looked_at(
    session: Session, upload: Upload, answers: Answers | None, moved: Collection[str] = ()
) -> tuple[Looked, ...]:
    """Each file as was answered, else as stated before, else as likely. Of those `moved` to another
    role no more is asked what they hold. Refused for an edition."""
    _require_draft(upload)
    found = []
    for file in upload.files:
        said = answers.files.get(file.role) if answers else None
        if said is None and file.mapping:
            said = said_in(Mapping.from_json(file.mapping), file.role)
        looked = look(
            uploads.file_bytes(session, upload.id, file.role),
            file.name,
            file.role,
            said,
            () if said else earlier(session, upload.collection, file.role),
        )
        if file.role in moved:
            rest = tuple(question for question in looked.open if question != "kind")
            looked = replace(looked, open=rest)
        found.append(looked)
    return tuple(found)


def mappings(looked: tuple[Looked, ...], answers: Answers) -> dict[str, Mapping]:
    """The mapping of each file, with what holds for all of them."""
    january = answers.basis is not None and answers.basis.population == JANUARY
    shared = {**answers.shared, "population_is": JANUARY if january else ""}
    return {
        one.role: one.mapping if one.role in LISTS else replace(one.mapping, **shared)
        for one in looked
    }


def errors_of(looked: tuple[Looked, ...], answers: Answers) -> dict[str, str]:
    """Every answer that is missing or not understood, by the name of its field."""
    return {**answers.errors, **open_errors(looked, answers.texts)}


def build(
    session: Session,
    upload_id: int,
    looked: tuple[Looked, ...] = (),
    answers: Answers | None = None,
    errors: Mapped[str, str] | None = None,
) -> UploadReadingPage:
    """As proposed; or as answered, with what is wrong beside each answer."""
    upload = uploads.find(session, upload_id)
    looked = looked or looked_at(session, upload, answers)
    errors = dict(errors or {})
    standing = editions.newest_standing(session, upload.collection)
    collection = collections.find(session, upload.collection)
    unreadable = [one.reading.name for one in looked if one.reading.problems]
    return UploadReadingPage(
        frame=Frame(
            title=_("How the files are read"),
            address=f"/uploads/{upload.id}/reading",
            locator=locator(upload, collection, phrase(_("mapping"))),
            shown=_("Not an edition"),
            nav="upload",
        ),
        answer=_answer(looked, unreadable, errors),
        lead=_lead(looked),
        tables=tuple(table for one in looked for table in (sample(one), *causes(one))),
        place=f"/uploads/{upload.id}",
        collection=collection.code,
        readable=len(unreadable) < len(looked),
        files=tuple(
            file_reading(file, one, errors) for file, one in zip(upload.files, looked, strict=True)
        ),
        asked=asked(
            looked,
            basis=upload.basis or (standing.basis if standing else UNSTATED),
            stated=_stated(upload, looked),
            texts=answers.texts if answers else None,
            errors=errors,
        ),
    )


def _answer(looked: tuple[Looked, ...], unreadable: list[str], errors: dict[str, str]) -> Sentence:
    if errors:
        return phrase(ask.still_open(len(errors)))
    return say.unreadable(unreadable) if unreadable else say.answer(len(looked))


def _lead(looked: tuple[Looked, ...]) -> tuple[Sentence, ...]:
    """What the files do not say by themselves, if anything."""
    open_ones = [asked for one in looked for asked in open_questions(one)]
    return (phrase(ask.asked_below(tuple(dict.fromkeys(open_ones)))),) if open_ones else ()


def _stated(upload: Upload, looked: tuple[Looked, ...]) -> Mapping:
    """What holds for all files, as far as it was stated, for this upload or an earlier one."""
    own = [Mapping.from_json(file.mapping) for file in upload.files if file.mapping]
    return (own or [one.mapping for one in looked] or [Mapping()])[0]


def _require_draft(upload: Upload) -> None:
    if upload.edition is not None:
        raise Refused(
            "Upload {upload} has become edition {edition} and stays as it is. "
            "Hand the corrected file in as a new upload.",
            upload=upload.id,
            edition=upload.edition,
        )


def earlier(session: Session, collection: str, role: str) -> tuple[Before, ...]:
    """How files of this role were read for the newest editions of a collection."""
    found = [
        Before(one.edition, Mapping.from_json(file.mapping))
        for one in uploads.listing(session, collection)
        for file in one.files
        if one.edition is not None and file.role == role and file.mapping
    ]
    return tuple(found[:MOST_EARLIER])
