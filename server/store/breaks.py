"""Breaks: dated changes that a trend must not cross, and years of shock; content of an edition."""

from collections.abc import Iterable
from typing import Any

from sqlalchemy import Select, select
from sqlalchemy.orm import Session

from server.store import collections
from server.store.records import Break
from server.store.tables import BreakRange


def listing(session: Session, collection: str, number: int) -> tuple[Break, ...]:
    """All that hold in an edition, by year, then area. One statement."""
    return of_rows(session.execute(statement(collection, number)))


def statement(
    collection: str, number: int
) -> Select[str, str, str, str, str, float | None, float | None]:
    """Reads the breaks of an edition; `of_rows` makes them of what it gives."""
    return select(
        BreakRange.area,
        BreakRange.period,
        BreakRange.kind,
        BreakRange.cause,
        BreakRange.note,
        BreakRange.ratio,
        BreakRange.ratio_error,
    ).where(BreakRange.collection_id == collections.id_of(collection), BreakRange.holds_in(number))


def of_rows(rows: Iterable[Any]) -> tuple[Break, ...]:
    """Breaks from rows of `statement`."""
    return in_order(Break(*row) for row in rows)


def in_order(breaks: Iterable[Break]) -> tuple[Break, ...]:
    """By year, then area, kind and cause."""
    return tuple(sorted(breaks, key=lambda one: (one.period, one.area, one.kind, one.cause)))
