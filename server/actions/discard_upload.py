"""Throw a draft away, files and all, so that their bytes are gone from the database's files."""

from server.accounts.viewer import Right, Viewer
from server.store import uploads
from server.store.connect import Session, scrub, transaction


def discard_upload(session: Session, *, upload_id: int, by: Viewer) -> None:
    """Raises: NotAllowed; Missing; Refused where the upload has become an edition."""
    by.require(Right.UPLOAD)
    with transaction(session):
        uploads.erase(session, upload_id)
    scrub(session)
