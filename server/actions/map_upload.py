"""Say how the files of a draft are to be read, and how their counts were made."""

import datetime as dt
from collections.abc import Mapping as Mapped

from server.accounts.viewer import Right, Viewer
from server.intake.mapping import Mapping
from server.store import uploads
from server.store.connect import Session, transaction
from server.store.records import Basis, Upload


def map_upload(
    session: Session,
    *,
    upload_id: int,
    mappings: Mapped[str, Mapping],
    basis: Basis,
    by: Viewer,
    now: dt.datetime,
) -> Upload:
    """Mapping of each file by its role. What earlier checks found no longer holds and is dropped.

    Whether a mapping fits its file the checks say.
    Raises: NotAllowed; Missing for the upload or a role; Refused where it is an edition already.
    """
    by.require(Right.UPLOAD)
    written = {role: mapping.to_json() for role, mapping in mappings.items()}
    with transaction(session):
        return uploads.set_mapping(session, upload_id, mappings=written, basis=basis)
