"""Take a withdrawal back."""

import datetime as dt

from server.accounts.viewer import Right, Viewer
from server.store import editions
from server.store.connect import Session, transaction
from server.store.records import Edition


def reinstate_edition(
    session: Session, *, collection: str, number: int, note: str, by: Viewer, now: dt.datetime
) -> Edition:
    """Raises: NotAllowed; Missing; Refused where the edition stands."""
    by.require(Right.WITHDRAW)
    with transaction(session):
        return editions.record_event(
            session, collection, number, "reinstated", by=by.name, note=note.strip(), at=now
        )
