"""The lists of an edition together: its areas, breaks and causes of death in one statement."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

from sqlalchemy import (
    Boolean,
    Double,
    Select,
    Text,
    bindparam,
    cast,
    literal,
    null,
    select,
    union_all,
)
from sqlalchemy.orm import Session
from sqlalchemy.types import TypeEngine

from server.store import areas, breaks, causes
from server.store.records import Area, Break, Cause


@dataclass(frozen=True, slots=True)
class Lists:
    """As `listing` of each gives them."""

    areas: tuple[Area, ...]
    breaks: tuple[Break, ...]
    causes: tuple[Cause, ...]


# how many columns of each type the lists have at most, in the order in which each has them
_TYPES: tuple[tuple[type[TypeEngine[Any]], int], ...] = ((Text, 7), (Double, 2), (Boolean, 1))
_OF: dict[str, Any] = {"areas": areas, "breaks": breaks, "causes": causes}
_COUNTS = {"areas": (3, 0, 1), "breaks": (5, 2, 0), "causes": (7, 1, 0)}


def lists(session: Session, collection: str, number: int) -> Lists:
    """One statement."""
    found: dict[str, list[list[Any]]] = {name: [] for name in _OF}
    for name, *row in session.execute(_STATEMENT, {"collection": collection, "number": number}):
        found[name].append(list(_without_padding(name, row)))
    return Lists(**{name: one.of_rows(found[name]) for name, one in _OF.items()})


def _padded(name: str, statement: Select[*tuple[Any, ...]]) -> Select[*tuple[Any, ...]]:
    """With the columns of all lists, of which it fills its own."""
    own = iter(statement.subquery().c)
    columns = []
    for (type_, most), count in zip(_TYPES, _COUNTS[name], strict=True):
        columns += [cast(next(own), type_) for _ in range(count)]
        columns += [cast(null(), type_) for _ in range(most - count)]
    return select(literal(name), *columns)


def _without_padding(name: str, row: Sequence[Any]) -> Iterator[Any]:
    at = 0
    for (_type, most), count in zip(_TYPES, _COUNTS[name], strict=True):
        yield from row[at : at + count]
        at += most


# made once: putting the statement together takes longer than running it
_STATEMENT = union_all(
    *(
        _padded(name, one.statement(bindparam("collection"), bindparam("number")))
        for name, one in _OF.items()
    )
)
