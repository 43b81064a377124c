"""From records to rows of the content tables."""

import datetime as dt
import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import asdict
from functools import lru_cache
from typing import Any

from sqlalchemy import insert, select, update
from sqlalchemy.dialects import postgresql, sqlite
from sqlalchemy.orm import Session

from server.store import digests
from server.store.ranges import RowKey
from server.store.records import Area, Break, Cause, Change, Key
from server.store.tables import AreaName, BreakRange, CauseLabel, Grid

Rows = Iterator[Mapping[str, Any]]


def schedules(
    session: Session,
    added: Mapping[RowKey, bytes],
    change: Change,
    packed: Mapping[Key, digests.Packed],
) -> Rows:
    """In the order of their keys: an index is filled more quickly from one end to the other."""
    cells = {key: cell for key, cell in change.cells.items() if key in added}
    by_grid = digests.by_grid(cells)
    grids = _grids(session, {digests.starts(grid) for grid in by_grid})
    grid_id = {key: grids[digests.starts(grid)] for grid, keys in by_grid.items() for key in keys}
    for key in sorted(cells):
        cell, (digest, vector) = cells[key], packed[key]
        yield {
            "area": key.area,
            "sex": key.sex,
            "period": key.period,
            "measure": key.measure,
            "cause": key.cause,
            "period_start": start_of(key.period),
            "status": cell.status,
            "estimated": cell.estimated,
            "grid_id": grid_id[key],
            "vector": vector,
            "digest": digest,
        }


def areas(added: Mapping[RowKey, bytes], change: Change) -> Rows:
    for area in change.areas:
        if digest := added.get((area.code,)):
            yield {
                "code": area.code,
                "parent": area.parent,
                "delivered": area.delivered,
                "digest": digest,
            }


def basis(added: Mapping[RowKey, bytes], change: Change) -> Rows:
    if digest := added.get(()):
        yield {**asdict(change.basis), "digest": digest}


def breaks(added: Mapping[RowKey, bytes], change: Change) -> Rows:
    for one in change.breaks:
        if digest := added.get(of_break(one)):
            yield {**asdict(one), "digest": digest}


def causes(added: Mapping[RowKey, bytes], change: Change) -> Rows:
    for cause in change.causes:
        if digest := added.get((cause.code,)):
            yield {
                "code": cause.code,
                "parent": cause.parent,
                "ranges": " ".join(cause.ranges),
                "kind": cause.kind,
                "care": cause.care,
                "sex": cause.sex,
                "digest": digest,
            }


def of_break(one: Break) -> RowKey:
    """The key in the order of the table's own."""
    return tuple(getattr(one, name) for name in BreakRange.KEY)


def name_areas(session: Session, collection_id: int, named: Sequence[Area]) -> None:
    """Keep the names given; an area without one keeps the name it has."""
    of_collection = AreaName.collection_id == collection_id
    known = {
        row.code: row.name
        for row in session.execute(select(AreaName.code, AreaName.name).where(of_collection))
    }
    for area in named:
        if not area.name or known.get(area.code) == area.name:
            continue
        if area.code in known:
            changed = update(AreaName).where(of_collection, AreaName.code == area.code)
            session.execute(changed.values(name=area.name))
        else:
            row = {"collection_id": collection_id, "code": area.code, "name": area.name}
            session.execute(insert(AreaName).values(row))


def label_causes(session: Session, collection_id: int, listed: Sequence[Cause]) -> None:
    """Keep the labels given and the order of the list; a cause without a label keeps the one it
    has."""
    of_collection = CauseLabel.collection_id == collection_id
    known = {
        row.code: (row.label, row.place)
        for row in session.execute(
            select(CauseLabel.code, CauseLabel.label, CauseLabel.place).where(of_collection)
        )
    }
    for place, cause in enumerate(listed):
        label, _before = known.get(cause.code, (cause.code, place))
        own = {"label": cause.label or label, "place": place}
        if cause.code not in known:
            row = {"collection_id": collection_id, "code": cause.code, **own}
            session.execute(insert(CauseLabel).values(row))
        elif known[cause.code] != (own["label"], place):
            changed = update(CauseLabel).where(of_collection, CauseLabel.code == cause.code)
            session.execute(changed.values(own))


@lru_cache(maxsize=1024)
def start_of(period: str) -> dt.date:
    """First day of a period. Raises: ValueError for what is no ISO 8601 year, '2014'.

    >>> start_of("2014")
    datetime.date(2014, 1, 1)
    """
    if not re.fullmatch("[0-9]{4}", period) or period == "0000":
        raise ValueError(f"period {period!r} is no year of four digits, as in '2014'")
    return dt.date(int(period), 1, 1)


def _grids(session: Session, codes: set[str]) -> dict[str, int]:
    """Ids of these grids; new ones are added, unless another collection's commit is quicker."""
    new: dict[str, Any] = {"sqlite": sqlite.insert, "postgresql": postgresql.insert}

    def known() -> dict[str, int]:
        found = session.execute(select(Grid.starts, Grid.id).where(Grid.starts.in_(codes)))
        return {row.starts: row.id for row in found}

    if missing := sorted(codes - known().keys()):
        adding = new[session.get_bind().dialect.name](Grid).on_conflict_do_nothing()
        session.execute(adding, [{"starts": code} for code in missing])
    return known()
