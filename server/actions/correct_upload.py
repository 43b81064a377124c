"""Hand in a corrected file: a new draft with the other files and the mapping of the one before."""

import datetime as dt

from server.accounts.viewer import Right, Viewer
from server.actions.receive_upload import LARGEST, File, taken
from server.store import uploads
from server.store.connect import Session, scrub, transaction
from server.store.errors import Missing
from server.store.records import Upload


def correct_upload(
    session: Session,
    *,
    upload_id: int,
    file: File,
    by: Viewer,
    now: dt.datetime,
    limit: int = LARGEST,
) -> Upload:
    """The draft it corrects is thrown away; what the database's files hold of it then, `scrub`
    says. All or nothing; nothing is checked yet.

    Raises: NotAllowed; Missing for the upload or the file's role; FileTooLarge; Refused where the
    upload has become an edition.
    """
    by.require(Right.UPLOAD)
    old = uploads.find(session, upload_id)
    roles = [one.role for one in old.files]
    if file[0] not in roles:
        raise Missing("file", file[0], roles)
    kept = [
        (one.role, one.name, uploads.file_bytes(session, upload_id, one.role))
        for one in old.files
        if one.role != file[0]
    ]
    files = taken([*kept, file], limit=limit)
    with transaction(session):
        new = uploads.receive(session, collection=old.collection, files=files, by=by.name, at=now)
        uploads.erase(session, upload_id)
        if old.basis is not None:
            mappings = {one.role: one.mapping for one in old.files}
            new = uploads.set_mapping(session, new.id, mappings=mappings, basis=old.basis)
    scrub(session)
    return new
