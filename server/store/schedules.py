"""Schedules: vectors over age, read in one statement however many."""

from collections.abc import Iterable
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np
from sqlalchemy import Select, and_, case, func, select
from sqlalchemy.orm import Session, aliased
from sqlalchemy.sql import ColumnElement

from engine.ages import AgeGrid, Array
from server.store import collections
from server.store.records import Key, Selection, Vector
from server.store.tables import Grid, Schedule

ALL = Selection()


@dataclass(frozen=True, slots=True)
class Contents:
    """What there is in an edition; codes in code-point order."""

    areas: tuple[str, ...]
    sexes: tuple[str, ...]
    periods: tuple[str, ...]
    measures: tuple[str, ...]
    status: dict[tuple[str, str, str], str]  # (area, sex, period): provisional if any measure is
    revised: frozenset[tuple[str, str, str]]  # those this edition changed


def load(
    session: Session, collection: str, number: int, selection: Selection = ALL
) -> dict[Key, Vector]:
    """The selected schedules of an edition, in the order of their keys. One statement.

    What there is not is left out: the caller knows what it asked for.
    """
    return of_rows(session.execute(statement(collection, number, selection)))


def statement(collection: str, number: int, selection: Selection) -> Select[*tuple[Any, ...]]:
    """Reads the selected schedules of an edition; `of_rows` makes them of what it gives."""
    return (
        select(
            Schedule.area,
            Schedule.sex,
            Schedule.period,
            Schedule.measure,
            Schedule.cause,
            Schedule.status,
            Grid.starts,
            Schedule.vector,
            Schedule.estimated,
        )
        .join(Grid, Grid.id == Schedule.grid_id)
        .where(
            Schedule.collection_id == collections.id_of(collection),
            Schedule.holds_in(number),
            *chosen(selection),
        )
    )


def of_rows(rows: Iterable[Any]) -> dict[Key, Vector]:
    """Schedules from rows of `statement`."""
    return {
        Key(*row[:5]): Vector(row.status, grid_of(row.starts), unpacked(row.vector), row.estimated)
        for row in sorted(rows, key=lambda row: row[:5])
    }


def numbers(
    session: Session, collection: str, number: int, periods: tuple[str, ...] | None = None
) -> int:
    """How many numbers by age an edition holds in these periods (None: in all). One statement."""
    found = session.execute(
        select(func.sum(func.length(Schedule.vector))).where(
            Schedule.collection_id == collections.id_of(collection),
            Schedule.holds_in(number),
            *chosen(Selection(periods=periods, cause=None)),
        )
    ).scalar_one()
    return int(found or 0) // 8


def held(session: Session, collection: str, number: int) -> dict[Key, AgeGrid]:
    """Every schedule of an edition and its age groups, without the numbers. One statement."""
    rows = session.execute(
        select(
            Schedule.area,
            Schedule.sex,
            Schedule.period,
            Schedule.measure,
            Schedule.cause,
            Grid.starts,
        )
        .join(Grid, Grid.id == Schedule.grid_id)
        .where(Schedule.collection_id == collections.id_of(collection), Schedule.holds_in(number))
    ).all()
    return {Key(*row[:5]): grid_of(row.starts) for row in rows}


def contents(session: Session, collection: str, number: int) -> Contents:
    """What an edition holds of all causes, without the numbers. One statement."""
    rows = session.execute(
        select(
            Schedule.area,
            Schedule.sex,
            Schedule.period,
            Schedule.measure,
            func.max(Schedule.status).label("status"),  # 'provisional' comes after 'final'
            func.max(case((_revised(number), 1), else_=0)).label("revised"),
        )
        .where(
            Schedule.collection_id == collections.id_of(collection),
            Schedule.holds_in(number),
            Schedule.cause == "",
        )
        .group_by(Schedule.area, Schedule.sex, Schedule.period, Schedule.measure)
    ).all()
    status: dict[tuple[str, str, str], str] = {}
    for row in sorted(rows, key=lambda row: row[:4]):
        where = (row.area, row.sex, row.period)
        status[where] = max(row.status, status.get(where, row.status))
    return Contents(
        areas=tuple(sorted({row.area for row in rows})),
        sexes=tuple(sorted({row.sex for row in rows})),
        periods=tuple(sorted({row.period for row in rows})),
        measures=tuple(sorted({row.measure for row in rows})),
        status=status,
        revised=frozenset((row.area, row.sex, row.period) for row in rows if row.revised),
    )


def _revised(number: int) -> ColumnElement[bool]:
    """Schedules that this edition has in place of others of the one before."""
    before = aliased(Schedule)
    return and_(
        Schedule.first == number,
        select(before.id)
        .where(
            before.collection_id == Schedule.collection_id,
            *(getattr(before, name) == getattr(Schedule, name) for name in Schedule.KEY),
            before.until == number,
        )
        .exists(),
    )


def unpacked(vector: bytes) -> Array:
    """The numbers of a stored vector, [age]; not to be written to."""
    return np.frombuffer(vector, "<f8").astype(np.float64, copy=False)


def chosen(selection: Selection) -> list[ColumnElement[bool]]:
    """The selection as conditions of a statement."""
    wanted: tuple[tuple[Any, tuple[str, ...] | None], ...] = (
        (Schedule.area, selection.areas),
        (Schedule.sex, selection.sexes),
        (Schedule.period, selection.periods),
        (Schedule.measure, selection.measures),
        (Schedule.cause, None if selection.cause is None else (selection.cause,)),
    )
    return [column.in_(codes) for column, codes in wanted if codes is not None]


grid_of = lru_cache(maxsize=256)(AgeGrid.parse)
