"""Collections: named bodies of mortality data."""

import datetime as dt

from sqlalchemy import ScalarSelect, Select, insert, select, update
from sqlalchemy.orm import Session

from server.store import tables
from server.store.errors import Missing, Taken
from server.store.records import Collection


def find(session: Session, code: str) -> Collection:
    """The collection of this code. Raises: Missing, with the codes there are."""
    which = _columns().where(tables.Collection.code == code)
    # no code has a zero character, and PostgreSQL refuses even to look for one
    row = session.execute(which).one_or_none() if "\0" not in code else None
    if row is None:
        raise Missing("collection", code, [one.code for one in all_collections(session)])
    return Collection(*row)


def all_collections(session: Session) -> tuple[Collection, ...]:
    """All there are, by code."""
    rows = session.execute(_columns()).all()
    return tuple(sorted((Collection(*row) for row in rows), key=lambda one: one.code))


def create(session: Session, *, code: str, name: str, owner: str, at: dt.datetime) -> Collection:
    """A new, empty collection. Raises: Taken."""
    if any(one.code == code for one in all_collections(session)):
        raise Taken("collection", code)
    session.execute(
        insert(tables.Collection).values(code=code, name=name, owner=owner, revision=0, made=at)
    )
    return find(session, code)


def id_of(code: str) -> ScalarSelect[int]:
    """The collection's id, inside another statement."""
    return select(tables.Collection.id).where(tables.Collection.code == code).scalar_subquery()


def lock(session: Session, code: str) -> Collection:
    """The collection, held until the transaction ends, so that one writer at a time judges what
    stands. (SQLite's writers take turns anyway.) Raises: Missing."""
    chosen = select(tables.Collection.id).where(tables.Collection.code == code)
    session.execute(chosen.with_for_update())
    return find(session, code)


def touch(session: Session, collection_id: int) -> None:
    """Count one change of standing, policy, names or notes: every page's tag changes with it."""
    session.execute(
        update(tables.Collection)
        .where(tables.Collection.id == collection_id)
        .values(revision=tables.Collection.revision + 1)
    )


def _columns() -> Select[int, str, str, str, int, dt.datetime]:
    row = tables.Collection
    return select(row.id, row.code, row.name, row.owner, row.revision, row.made)
