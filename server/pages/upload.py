"""One upload: its files as they were handed in, and where it stands."""

from dataclasses import dataclass
from typing import ClassVar

from server.pages.entry import Entry
from server.pages.page import Frame, Page
from server.pages.uploads import state
from server.sentences import reading
from server.sentences import uploads as say
from server.sentences.dates import day
from server.sentences.numbers import whole
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _
from server.store import collections, uploads
from server.store.connect import Session
from server.store.records import Collection, Upload, UploadFile


@dataclass(frozen=True, slots=True, kw_only=True)
class UploadPage(Page):
    """What was handed in, and is it still what it was?"""

    template: ClassVar[str] = "upload/page.html"
    files: tuple[Entry, ...]
    place: str  # address of the upload
    draft: bool
    checked: bool
    erased: bool  # nothing of the bytes is left


def build(session: Session, upload_id: int) -> UploadPage:
    upload = uploads.find(session, upload_id)
    collection = collections.find(session, upload.collection)
    return UploadPage(
        frame=Frame(
            title=_("Upload {number}", number=upload.id),
            address=f"/uploads/{upload.id}",
            locator=locator(upload, collection, phrase(_("as it was handed in"))),
            nav="upload",
        ),
        answer=_answer(upload, collection),
        files=tuple(_file(file) for file in upload.files),
        place=f"/uploads/{upload.id}",
        draft=upload.edition is None,
        checked=bool(upload.report),
        erased=all(file.erased for file in upload.files),
    )


def locator(upload: Upload, collection: Collection, place: Sentence) -> Sentence:
    """Where a page of the upload walk stands. `place` says which step it is."""
    start = phrase(
        _("{collection}: {upload} of {day}, "),
        collection=Piece(collection.name, f"/c/{collection.code}/editions"),
        upload=Piece(_("upload {number}", number=upload.id), f"/uploads/{upload.id}"),
        day=day(upload.received),
    )
    return start + place


def _answer(upload: Upload, collection: Collection) -> Sentence:
    stands = Piece(state(upload))
    if upload.edition is not None:
        stands = Piece(stands.text, f"/c/{collection.code}/{upload.edition}/contents")
    return phrase(
        _("Upload {number} for {collection}, handed in on {day} by {by}: {state}."),
        number=str(upload.id),
        collection=collection.name,
        day=day(upload.received),
        by=upload.by,
        state=stands,
    )


def _file(file: UploadFile) -> Entry:
    return Entry(
        key=file.role,
        label=file.name,
        symbol="",
        facts=(
            (_("Holds"), reading.role(file.role)),
            (_("Size"), _("{size} bytes", size=whole(file.size))),
            (_("SHA-256"), file.sha256),
            *_erased(file),
        ),
    )


def _erased(file: UploadFile) -> tuple[tuple[str, str], ...]:
    """That its bytes are no longer kept."""
    if file.erased is None:
        return ()
    return ((_("Erased"), say.erased(file.erased, file.erased_by, file.erased_why)),)
