"""What a collection is released under; a change is a new number, and the newest holds."""

import datetime as dt
import json
import secrets
from dataclasses import asdict

from sqlalchemy import func, insert, select
from sqlalchemy.orm import Session

from server.store import collections, tables
from server.store.records import Policy, Terms

_SECRET = "secret"


def newest(session: Session, collection: str) -> Policy | None:
    """The policy that holds; None where everything is shown. One statement."""
    return next(iter(listing(session, collection)), None)


def listing(session: Session, collection: str) -> tuple[Policy, ...]:
    """All policies there were, newest first. One statement."""
    row = tables.Policy
    rows = session.execute(
        select(row.number, row.terms, row.made, row.by, row.note)
        .where(row.collection_id == collections.id_of(collection))
        .order_by(row.number.desc())
    ).all()
    return tuple(Policy(one.number, read(one.terms), one.made, one.by, one.note) for one in rows)


def read(text: str) -> Terms:
    """Terms as they are stored."""
    return Terms(**{name: value for name, value in json.loads(text).items() if name != _SECRET})


def secret(session: Session, collection: str, number: int) -> str:
    """What digests of what is released are made with, so that nobody can try guesses on them; that
    of the first policy is what counts are rounded with, under all of them. Empty where there is no
    such policy."""
    row = tables.Policy
    text = session.scalar(
        select(row.terms).where(
            row.collection_id == collections.id_of(collection), row.number == number
        )
    )
    return str(json.loads(text or "{}").get(_SECRET, ""))


def new_secret() -> str:
    return secrets.token_hex(16)


def write(
    session: Session,
    collection: str,
    terms: Terms,
    *,
    by: str,
    note: str,
    at: dt.datetime,
    secret: str = "",
) -> Policy:
    """The next policy, inside a transaction; every page's tag changes with it. Raises: Missing."""
    locked = collections.lock(session, collection)
    row = tables.Policy
    highest = session.scalar(select(func.max(row.number)).where(row.collection_id == locked.id))
    number = (highest or 0) + 1
    session.execute(
        insert(row).values(
            collection_id=locked.id,
            number=number,
            terms=json.dumps(asdict(terms) | {_SECRET: secret or new_secret()}, sort_keys=True),
            made=at,
            by=by,
            note=note,
        )
    )
    collections.touch(session, locked.id)
    return Policy(number, terms, at, by, note)
