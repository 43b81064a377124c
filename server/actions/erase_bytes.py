"""Erase the bytes of an upload: personal data were sent by mistake."""

import datetime as dt
from dataclasses import dataclass

from server.accounts.viewer import Right, Viewer
from server.store import uploads
from server.store.connect import Session, scrub, transaction
from server.store.errors import Refused
from server.store.records import Upload


@dataclass(frozen=True, slots=True)
class Erased:
    upload: Upload
    gone: bool  # False: a reader at work still holds a copy in the database's log of writes


def erase_bytes(
    session: Session, *, upload_id: int, why: str, by: Viewer, now: dt.datetime
) -> Erased:
    """Digests, mappings, report and edition stay, so that what was handed in can still be told from
    anything else; nothing can be read from the files again, nor the edition made anew.

    Done again, it only sees anew to what a reader held up.
    Raises: NotAllowed; Missing; Refused where the reason is empty, or the upload is a draft.
    """
    by.require(Right.ADMINISTER)
    if not why.strip():
        raise Refused(
            "The bytes of upload {upload} cannot be erased without a reason. Say why; it stands "
            "beside the upload from then on.",
            upload=upload_id,
        )
    upload = uploads.find(session, upload_id)
    if upload.edition is None:
        raise Refused(
            "Upload {upload} is a draft. Discard it, and say that it holds personal data: its "
            "files go with it.",
            upload=upload_id,
        )
    if any(file.erased is None for file in upload.files):
        with transaction(session):
            uploads.empty(session, upload_id, by=by.name, why=why.strip(), at=now)
    gone = scrub(session, erased=True)
    return Erased(uploads.find(session, upload_id), gone)
