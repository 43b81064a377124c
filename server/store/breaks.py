"""Breaks: dated changes that a trend must not cross, and years of shock; content of an edition."""

from collections.abc import Iterable

from sqlalchemy import select
from sqlalchemy.orm import Session

from server.store import collections
from server.store.records import Break
from server.store.tables import BreakRange


def listing(session: Session, collection: str, number: int) -> tuple[Break, ...]:
    """All that hold in an edition, by year, then area. One statement."""
    rows = session.execute(
        select(
            BreakRange.area,
            BreakRange.period,
            BreakRange.kind,
            BreakRange.cause,
            BreakRange.note,
            BreakRange.ratio,
            BreakRange.ratio_error,
        ).where(
            BreakRange.collection_id == collections.id_of(collection), BreakRange.holds_in(number)
        )
    ).all()
    return in_order(Break(*row) for row in rows)


def in_order(breaks: Iterable[Break]) -> tuple[Break, ...]:
    """By year, then area, kind and cause."""
    return tuple(sorted(breaks, key=lambda one: (one.period, one.area, one.kind, one.cause)))
