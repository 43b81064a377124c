"""Take files in, byte for byte, as a draft."""

import datetime as dt
from collections import Counter
from collections.abc import Sequence

from server.accounts.viewer import Right, Viewer
from server.intake.mapping import EVERY_ROLE
from server.store import uploads
from server.store.connect import Session, transaction
from server.store.errors import Refused
from server.store.records import Upload

LARGEST = 60_000_000  # bytes of all files of an upload, where the caller sets no limit of its own
LONGEST_NAME = 120

File = tuple[str, str, bytes]  # role, name, content


class FileTooLarge(Refused):
    """The files together are over the limit."""


def receive_upload(
    session: Session,
    *,
    collection: str,
    files: Sequence[File],
    by: Viewer,
    now: dt.datetime,
    limit: int = LARGEST,
) -> Upload:
    """Keep the files, each (role, name, content). Nothing is read yet.

    Raises: NotAllowed; Missing for the collection; FileTooLarge; Refused where no file was handed
    in, a role is unknown or two files have the same one.
    """
    by.require(Right.UPLOAD)
    named = taken(files, limit=limit)
    with transaction(session):
        return uploads.receive(session, collection=collection, files=named, by=by.name, at=now)


def taken(files: Sequence[File], *, limit: int) -> list[File]:
    """Files that can be kept, under names that can be shown. Raises: FileTooLarge; Refused."""
    require_roles([role for role, _, _ in files])
    size = sum(len(content) for _, _, content in files)
    if size > limit:
        raise FileTooLarge(
            "The files have {size} bytes, but an upload may have at most {limit}. Split them by "
            "years and upload the parts one after the other.",
            size=size,
            limit=limit,
        )
    return [(role, _name(name) or f"{role}.csv", content) for role, name, content in files]


def require_roles(roles: list[str]) -> None:
    """Raises: Refused where there is none, one is unknown, or one comes twice."""
    if not roles:
        raise Refused("No file was handed in. Choose a file of deaths and one of population.")
    for role, count in Counter(roles).items():
        if role not in EVERY_ROLE:
            raise Refused(
                "A file was handed in as {role}, which is no kind of file. It must be one of: "
                "{known}.",
                role=role,
                known=", ".join(EVERY_ROLE),
            )
        if count > 1:
            raise Refused(
                "{count} files were handed in as {role}, but an upload has one of each kind. Join "
                "them, or upload one after the other.",
                count=count,
                role=role,
            )


def _name(name: str) -> str:
    """The last part of a path, printable and not too long: names are shown, never opened."""
    last = name.replace("\\", "/").rsplit("/", 1)[-1]
    return "".join(sign for sign in last if sign.isprintable()).strip()[-LONGEST_NAME:]
