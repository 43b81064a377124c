"""Cause lists: the tree is content of an edition, labels and the order of the list presentation."""

from collections.abc import Iterable
from typing import Any

from sqlalchemy import Select, and_, func, select
from sqlalchemy.orm import Session

from server.store import collections
from server.store.errors import Refused
from server.store.records import Cause
from server.store.tables import CauseLabel, CauseRange
from server.store.trees import from_tops


def listing(session: Session, collection: str, number: int) -> tuple[Cause, ...]:
    """The cause list of an edition, each cause before its parts, siblings in the order in which
    they were last handed in; empty where the edition has none. One statement."""
    return of_rows(session.execute(statement(collection, number)))


def of_rows(rows: Iterable[Any]) -> tuple[Cause, ...]:
    """Causes from rows of `statement`."""
    ordered = sorted(rows, key=lambda row: (row[7], row[0]))
    return in_tree_order(
        Cause(code, label, parent, tuple(ranges.split()), kind, care, sex)
        for code, label, parent, ranges, kind, care, sex, _place in ordered
    )


def statement(collection: str, number: int) -> Select[str, str, str, str, str, str, str, int]:
    """Reads the causes of an edition; `of_rows` makes them of what it gives."""
    return (
        select(
            CauseRange.code,
            func.coalesce(CauseLabel.label, CauseRange.code).label("label"),
            CauseRange.parent,
            CauseRange.ranges,
            CauseRange.kind,
            CauseRange.care,
            CauseRange.sex,
            func.coalesce(CauseLabel.place, 0).label("place"),
        )
        .outerjoin(
            CauseLabel,
            and_(
                CauseLabel.collection_id == CauseRange.collection_id,
                CauseLabel.code == CauseRange.code,
            ),
        )
        .where(
            CauseRange.collection_id == collections.id_of(collection), CauseRange.holds_in(number)
        )
    )


def of_editions(
    session: Session, collection: str, numbers: Iterable[int]
) -> dict[int, tuple[Cause, ...]]:
    """Codes, kinds and places of the causes of several editions, without labels. One statement."""
    row = CauseRange
    rows = session.execute(
        select(row.code, row.parent, row.kind, row.first, row.until)
        .where(row.collection_id == collections.id_of(collection))
        .order_by(row.code)
    ).all()
    return {
        number: tuple(
            Cause(one.code, "", one.parent, kind=one.kind)
            for one in rows
            if one.first <= number and (one.until is None or one.until > number)
        )
        for number in numbers
    }


def in_tree_order(causes: Iterable[Cause]) -> tuple[Cause, ...]:
    """Each cause before its parts, siblings in the order given.

    Raises: Refused where a cause is part of one that is not listed, or of itself.
    """
    listed = tuple(causes)
    codes = {cause.code for cause in listed}
    for cause in listed:
        if cause.parent and cause.parent not in codes:
            raise Refused(
                "Cause {cause} is said to be part of {parent}, which is not in the list. Add "
                "{parent}, or leave the whole of {cause} empty.",
                cause=cause.code,
                parent=cause.parent,
            )
    ordered = from_tops(listed)
    if inside := sorted(codes - {cause.code for cause in ordered}):
        raise Refused(
            "Causes {causes} are part of themselves. Correct what they are part of, so that the "
            "list forms a tree.",
            causes=", ".join(inside),
        )
    return ordered


def leaves(causes: Iterable[Cause]) -> tuple[Cause, ...]:
    """Those without parts, under which deaths are counted, in the order of the list."""
    listed = tuple(causes)
    wholes = {cause.parent for cause in listed}
    return tuple(cause for cause in listed if cause.code not in wholes)


def lineages(causes: Iterable[Cause]) -> dict[str, tuple[str, ...]]:
    """Code of every cause to the codes from it to the top of the tree.

    >>> lineages([Cause("heart", "", ""), Cause("coronary", "", "heart")])
    {'heart': ('heart',), 'coronary': ('coronary', 'heart')}
    """
    above = {cause.code: cause.parent for cause in causes}

    def lineage(code: str) -> tuple[str, ...]:
        return (code, *lineage(above[code])) if code in above else ()

    return {code: lineage(code) for code in above}
