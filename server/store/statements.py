"""What analysts state of an edition's quality: the newest statement holds, all are kept."""

import datetime as dt
import json
from collections.abc import Mapping

from sqlalchemy import insert, select
from sqlalchemy.orm import Session

from server.store import collections
from server.store.errors import Missing
from server.store.records import Statement
from server.store.tables import Edition as EditionRow
from server.store.tables import Statement as StatementRow

QUESTIONS = ("source", "completeness", "population", "faults", "late", "contact")
LONGEST = 2_000  # signs of an answer


def listing(session: Session, collection: str, edition: int) -> tuple[Statement, ...]:
    """All statements of an edition, newest first. One statement."""
    row = StatementRow
    rows = session.execute(
        select(row.at, row.by, row.answers)
        .where(row.collection_id == collections.id_of(collection), row.edition == edition)
        .order_by(row.id.desc())
    ).all()
    return tuple(Statement(one.at, one.by, json.loads(one.answers)) for one in rows)


def add(
    session: Session,
    collection: str,
    edition: int,
    answers: Mapping[str, str],
    *,
    by: str,
    at: dt.datetime,
) -> Statement:
    """A further statement, inside a transaction; the tags of the collection's pages change with it.
    Raises: Missing for the collection or the edition."""
    locked = collections.lock(session, collection)
    known = session.scalars(
        select(EditionRow.number).where(EditionRow.collection_id == locked.id)
    ).all()
    if edition not in known:
        raise Missing("edition", edition, sorted(known))
    said = dict(answers)
    session.execute(
        insert(StatementRow).values(
            collection_id=locked.id,
            edition=edition,
            at=at,
            by=by,
            answers=json.dumps(said, ensure_ascii=False, sort_keys=True),
        )
    )
    collections.touch(session, locked.id)
    return Statement(at, by, said)
