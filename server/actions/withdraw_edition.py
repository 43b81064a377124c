"""Withdraw an edition: its pages stay, with a notice; it is no longer the one that stands."""

import datetime as dt

from server.accounts.viewer import Right, Viewer
from server.store import editions
from server.store.connect import Session, transaction
from server.store.errors import Refused
from server.store.records import Edition


def withdraw_edition(
    session: Session, *, collection: str, number: int, note: str, by: Viewer, now: dt.datetime
) -> Edition:
    """The note says why; it stands on every page of the edition.

    Raises: NotAllowed; Missing; Refused where it is withdrawn already or the note is empty.
    """
    by.require(Right.WITHDRAW)
    if not note.strip():
        raise Refused(
            "Edition {edition} cannot be withdrawn without a note. Say why; readers of its pages "
            "will see it.",
            edition=number,
        )
    with transaction(session):
        return editions.record_event(
            session, collection, number, "withdrawn", by=by.name, note=note.strip(), at=now
        )
