"""One upload: its files as they were handed in, and where it stands."""

from dataclasses import dataclass
from typing import ClassVar

from server.exports.table import Column, Row, Table
from server.pages.page import Frame, Page
from server.pages.uploads import state
from server.sentences import reading
from server.sentences.dates import day
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _
from server.store import collections, uploads
from server.store.connect import Session
from server.store.records import Collection, Upload


@dataclass(frozen=True, slots=True, kw_only=True)
class UploadPage(Page):
    """What was handed in, and is it still what it was?"""

    template: ClassVar[str] = "upload/page.html"
    place: str  # address of the upload
    draft: bool
    checked: bool


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
        tables=(_files(upload),),
        place=f"/uploads/{upload.id}",
        draft=upload.edition is None,
        checked=bool(upload.report),
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


def _files(upload: Upload) -> Table:
    return Table(
        "files",
        _("Files"),
        (
            Column("name", _("file")),
            Column("role", _("holds")),
            Column("size", _("bytes"), decimals=0),
            Column("sha256", _("SHA-256")),
        ),
        tuple(
            Row((file.name, reading.role(file.role), file.size, file.sha256))
            for file in upload.files
        ),
        _("Kept byte for byte. Every edition can be made anew from these bytes."),
    )
