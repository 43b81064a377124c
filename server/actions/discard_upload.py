"""Throw a draft away, files and all."""

from server.accounts.viewer import Right, Viewer
from server.store import uploads
from server.store.connect import Session, scrub, transaction


def discard_upload(session: Session, *, upload_id: int, by: Viewer, personal: bool = False) -> bool:
    """With `personal`, since personal data were sent by mistake, also what the database's files
    still hold of it (`scrub`); whether nothing is left there.

    Raises: NotAllowed; Missing; Refused where the upload has become an edition.
    """
    by.require(Right.UPLOAD)
    with transaction(session):
        uploads.erase(session, upload_id)
    return scrub(session, erased=personal)
