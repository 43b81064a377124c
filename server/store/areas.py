"""Areas: their tree is content of an edition, their names are presentation."""

from collections.abc import Iterable
from typing import Any

from sqlalchemy import Select, and_, func, select
from sqlalchemy.orm import Session

from server.store import collections
from server.store.errors import Refused
from server.store.records import Area
from server.store.tables import AreaName, AreaRange
from server.store.trees import from_tops


def listing(session: Session, collection: str, number: int) -> tuple[Area, ...]:
    """Areas of an edition, each before its parts, siblings by code. One statement.

    An area without a name is called by its code.
    """
    return of_rows(session.execute(statement(collection, number)))


def statement(collection: str, number: int) -> Select[str, str, str, bool]:
    """Reads the areas of an edition; `of_rows` makes them of what it gives."""
    return (
        select(
            AreaRange.code,
            func.coalesce(AreaName.name, AreaRange.code).label("name"),
            AreaRange.parent,
            AreaRange.delivered,
        )
        .outerjoin(
            AreaName,
            and_(
                AreaName.collection_id == AreaRange.collection_id, AreaName.code == AreaRange.code
            ),
        )
        .where(AreaRange.collection_id == collections.id_of(collection), AreaRange.holds_in(number))
    )


def of_rows(rows: Iterable[Any]) -> tuple[Area, ...]:
    """Areas from rows of `statement`."""
    return in_tree_order(Area(*row) for row in rows)


def in_tree_order(areas: Iterable[Area]) -> tuple[Area, ...]:
    """Each area before its parts, siblings by code.

    Raises: Refused where a parent is not among them, or an area lies inside itself.
    """
    by_code = {area.code: area for area in areas}
    listed = sorted(by_code.values(), key=lambda area: area.code)
    for area in reversed(listed):
        if area.parent and area.parent not in by_code:
            raise Refused(
                "Area {area} is said to be part of {parent}, which is not among the areas. "
                "Add {parent}, or leave the parent of {area} empty.",
                area=area.code,
                parent=area.parent,
            )
    ordered = from_tops(listed)
    if inside := sorted(by_code.keys() - {area.code for area in ordered}):
        raise Refused(
            "Areas {areas} lie inside themselves. Correct their parents so that they form a tree.",
            areas=", ".join(inside),
        )
    return ordered
