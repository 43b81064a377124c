"""Say anew what each file of a draft holds."""

from collections.abc import Mapping

from server.accounts.viewer import Right, Viewer
from server.actions.receive_upload import require_roles
from server.store import uploads
from server.store.connect import Session, transaction
from server.store.records import Upload


def sort_files(session: Session, *, upload_id: int, roles: Mapping[str, str], by: Viewer) -> Upload:
    """`roles`: what each file is to be, by what it was. How a file that moves was to be read, and
    the report, are dropped.

    Raises: NotAllowed; Missing for the upload or a role; Refused where a role is unknown, two files
    would have the same one, or the upload has become an edition.
    """
    by.require(Right.UPLOAD)
    with transaction(session):
        old = [file.role for file in uploads.lock(session, upload_id).files]
        require_roles([roles.get(role, role) for role in old])
        return uploads.set_roles(session, upload_id, roles=dict(roles))
