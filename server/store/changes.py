"""What differs between two editions, and how the schedules of a year read in earlier ones."""

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

from sqlalchemy import CTE, func, or_, select
from sqlalchemy.orm import Session, aliased
from sqlalchemy.sql import ColumnElement

from server.store import collections
from server.store.records import Area, Key, Selection, Vector
from server.store.schedules import chosen, grid_of, unpacked
from server.store.tables import AreaRange, Edition, Grid, Schedule

Pair = tuple[Vector | None, Vector | None]  # then and now; None: not held


@dataclass(frozen=True, slots=True)
class Held:
    """A schedule and the range of editions it holds in."""

    vector: Vector
    digest: bytes
    first: int
    until: int | None

    def holds_in(self, number: int) -> bool:
        return self.first <= number and (self.until is None or self.until > number)


_COLUMNS = (
    Schedule.area,
    Schedule.sex,
    Schedule.period,
    Schedule.measure,
    Schedule.cause,
    Schedule.status,
    Grid.starts,
    Schedule.vector,
    Schedule.estimated,
    Schedule.first,
    Schedule.until,
    Schedule.digest,
)


def differing(session: Session, collection: str, then: int, now: int) -> dict[Key, Pair]:
    """The schedules that are not the same in the two editions, in the order of their keys. One
    statement, which reads those alone that hold in one of the two."""
    held_then, held_now = Schedule.holds_in(then), Schedule.holds_in(now)
    rows = session.execute(
        select(*_COLUMNS)
        .join(Grid, Grid.id == Schedule.grid_id)
        .where(
            Schedule.collection_id == collections.id_of(collection),
            or_(held_then, held_now),
            ~(held_then & held_now),
        )
    ).all()
    sides: tuple[dict[Key, Held], dict[Key, Held]] = ({}, {})
    for row in rows:
        one = _held(row)
        sides[0 if one.holds_in(then) else 1][Key(*row[:5])] = one
    pairs = {
        key: (sides[0].get(key), sides[1].get(key)) for key in sorted({**sides[0], **sides[1]})
    }
    return {
        key: (old.vector if old else None, new.vector if new else None)
        for key, (old, new) in pairs.items()
        if old is None or new is None or old.digest != new.digest
    }


def lineage(session: Session, collection: str, number: int) -> tuple[int, ...]:
    """The edition, the one it was built on, and so on to the first: none of them ever changes, and
    what stands among them is no matter of later events. One statement."""
    rows = session.execute(
        select(Edition.number, Edition.base).where(
            Edition.collection_id == collections.id_of(collection), Edition.number <= number
        )
    ).all()
    bases = {row.number: row.base for row in rows}
    found: list[int] = []
    while number in bases:
        found.append(number)
        number = bases[number]
    return tuple(found)


def once_provisional(
    session: Session, collection: str, number: int, measures: Iterable[str]
) -> dict[Key, tuple[tuple[int, Held], ...]]:
    """Schedules of those areas and years of which one was provisional and has been superseded by
    edition `number`: every version that held in it or in one it was built on, with the first of
    these, in their order. One statement."""
    line = _line(collection, number)
    earlier = aliased(Schedule)
    superseded = (
        select(earlier.id)
        .where(
            earlier.collection_id == Schedule.collection_id,
            earlier.area == Schedule.area,
            earlier.period == Schedule.period,
            earlier.status == "provisional",
            earlier.until <= number,
        )
        .exists()
    )
    rows = session.execute(
        select(*_COLUMNS, func.min(line.c.number).label("since"))
        .join(Grid, Grid.id == Schedule.grid_id)
        .join(line, Schedule.holds_in(line.c.number))
        .where(
            Schedule.collection_id == collections.id_of(collection),
            Schedule.measure.in_(tuple(measures)),
            Schedule.cause == "",
            superseded,
        )
        .group_by(Schedule.id, Grid.starts)
    ).all()
    found: dict[Key, list[tuple[int, Held]]] = {}
    for row in sorted(rows, key=lambda row: (row[:5], row.since)):
        found.setdefault(Key(*row[:5]), []).append((row.since, _held(row)))
    return {key: tuple(all_) for key, all_ in found.items()}


def _line(collection: str, number: int) -> CTE:
    """The edition, the one it was built on, and so on, inside another statement."""
    of_collection = Edition.collection_id == collections.id_of(collection)
    last = select(Edition.number, Edition.base).where(of_collection, Edition.number == number)
    line = last.cte("line", recursive=True)
    return line.union_all(
        select(Edition.number, Edition.base).where(of_collection, Edition.number == line.c.base)
    )


def versions(
    session: Session, collection: str, number: int, selection: Selection
) -> dict[Key, tuple[Held, ...]]:
    """Every version up to edition `number` of the selected schedules, in the order of their
    editions. One statement."""
    return _versions(session, collection, Schedule.first <= number, *chosen(selection))


def tree(session: Session, collection: str, numbers: Iterable[int]) -> dict[int, tuple[Area, ...]]:
    """Places of the areas in several editions, by code, without names. One statement."""
    rows = session.execute(
        select(
            AreaRange.code,
            AreaRange.parent,
            AreaRange.delivered,
            AreaRange.first,
            AreaRange.until,
        )
        .where(AreaRange.collection_id == collections.id_of(collection))
        .order_by(AreaRange.code)
    ).all()
    return {
        number: tuple(
            Area(row.code, "", row.parent, row.delivered)
            for row in sorted(rows, key=lambda row: row.code)
            if row.first <= number and (row.until is None or row.until > number)
        )
        for number in numbers
    }


def _versions(
    session: Session, collection: str, *which: ColumnElement[bool]
) -> dict[Key, tuple[Held, ...]]:
    rows = session.execute(
        select(*_COLUMNS)
        .join(Grid, Grid.id == Schedule.grid_id)
        .where(Schedule.collection_id == collections.id_of(collection), *which)
    ).all()
    found: dict[Key, list[Held]] = {}
    for row in sorted(rows, key=lambda row: (row[:5], row.first)):
        found.setdefault(Key(*row[:5]), []).append(_held(row))
    return {key: tuple(ones) for key, ones in found.items()}


def _held(row: Any) -> Held:
    vector = Vector(row.status, grid_of(row.starts), unpacked(row.vector), row.estimated)
    return Held(vector, row.digest, row.first, row.until)
