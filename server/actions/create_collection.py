"""Open a new, empty collection."""

import datetime as dt
import re

from server.accounts.viewer import Right, Viewer
from server.store import collections
from server.store.connect import Session, transaction
from server.store.errors import Refused
from server.store.records import Collection


def create_collection(
    session: Session, *, code: str, name: str, owner: str, by: Viewer, now: dt.datetime
) -> Collection:
    """The code becomes part of every address and cannot be changed; the name can.

    Raises: NotAllowed; Taken; Refused where code, name or owner cannot be used.
    """
    by.require(Right.ADMINISTER)
    if not code:
        raise Refused(
            "A new collection needs a code, which becomes part of every address. Choose a short "
            "one such as 'saltmarsh'."
        )
    # '.' and '..' would be taken for folders by whoever follows the address
    if not re.fullmatch(r"[A-Za-z0-9_.-]{1,32}", code) or not code.strip("."):
        raise Refused(
            "The code of a collection is {code}; expected 1 to 32 of the letters a to z, digits, "
            "point, hyphen and underscore, and not points alone. Choose a short code such as "
            "'saltmarsh'.",
            code=repr(code),
        )
    for text in (name, owner):
        if not text.strip():
            raise Refused(
                "The collection {code} needs a name and an owner. Say what the data are and "
                "which office answers for them.",
                code=code,
            )
    with transaction(session):
        return collections.create(
            session, code=code, name=name.strip(), owner=owner.strip(), at=now
        )
