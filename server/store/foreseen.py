"""What an edition made of a draft would change, worked out when it was checked."""

from sqlalchemy import delete, insert, select

from server.store.connect import Session
from server.store.tables import Foreseen as Row


def keep(session: Session, upload_id: int, *, taking: str, base: int, content: str) -> None:
    """`content` (JSON) is what taking this of the upload would change of edition `base`; it takes
    the place of what was kept for the same choice."""
    which = (Row.upload_id == upload_id, Row.taking == taking)
    session.execute(delete(Row).where(*which))
    row = {"upload_id": upload_id, "taking": taking, "base": base, "content": content}
    session.execute(insert(Row).values(row))


def find(session: Session, upload_id: int, *, taking: str, base: int) -> str | None:
    """What was kept for this choice beside this base; None where nothing was."""
    which = (Row.upload_id == upload_id, Row.taking == taking, Row.base == base)
    return session.execute(select(Row.content).where(*which)).scalar_one_or_none()


def forget(session: Session, upload_id: int) -> None:
    """What was worked out of an upload no longer holds."""
    session.execute(delete(Row).where(Row.upload_id == upload_id))
