"""Content that holds over a range of editions: one row for as long as nothing changes.

What a new edition holds is decided by the newest *standing* edition and the upload. The rows to
close and to add follow from the *highest number*, standing or not: its rows are the ones whose
range is still open. Taking the difference from the standing edition instead breaks older editions
as soon as one was withdrawn.
"""

from collections.abc import Collection, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import islice
from typing import Any, cast

from sqlalchemy import Table, func, insert, literal, select, update
from sqlalchemy.orm import Session

from server.store.tables import (
    AreaRange,
    BasisRange,
    BreakRange,
    CauseRange,
    Edition,
    Schedule,
)

STEP = 5000  # rows a statement: databases limit the values one statement may carry
RowKey = tuple[str, ...]
Content = type[Schedule] | type[AreaRange] | type[BasisRange] | type[BreakRange] | type[CauseRange]


@dataclass(frozen=True, slots=True)
class Difference:
    """What turns the rows of the highest number into those of the next one."""

    close: tuple[int, ...]  # ids of rows that hold no longer
    again: tuple[int, ...]  # ids of rows of the base, no longer open, that hold again
    add: Mapping[RowKey, bytes]  # what was handed in and is new: its key and digest
    digests: tuple[bytes, ...]  # of everything that holds
    fresh: tuple[RowKey, ...]  # keys the base does not hold
    altered: Mapping[RowKey, bytes]  # keys whose content is another: the base's digest
    dropped: tuple[RowKey, ...]  # keys of the base that hold no longer


def highest(session: Session, collection_id: int) -> int:
    """The highest edition number of the collection, standing or not; 0 where there is none."""
    number = session.scalar(
        select(func.max(Edition.number)).where(Edition.collection_id == collection_id)
    )
    return number or 0


def difference(
    session: Session,
    table: Content,
    collection_id: int,
    *,
    base: int,
    against: int,
    handed: Mapping[RowKey, bytes],
    ended: Collection[RowKey] = (),
    replace: bool = False,
) -> Difference:
    """How the next edition's rows differ from those of edition `against`, the highest number.

    `handed` (key -> digest) is laid over edition `base`, or stands alone with `replace`; `ended`
    are keys of the base that are dropped. At most two statements.
    """
    open_rows = _rows(session, table, collection_id, against)
    base_rows = open_rows if base == against else _rows(session, table, collection_id, base)
    kept = {} if replace else {key: row for key, row in base_rows.items() if key not in ended}
    wanted = {key: digest for key, (_, digest) in kept.items()} | dict(handed)
    same = {key for key, (_, digest) in open_rows.items() if wanted.get(key) == digest}
    return Difference(
        close=tuple(id_ for key, (id_, _) in open_rows.items() if key not in same),
        again=tuple(id_ for key, (id_, _) in kept.items() if key not in same and key not in handed),
        add={key: digest for key, digest in handed.items() if key not in same},
        digests=tuple(wanted.values()),
        fresh=tuple(key for key in wanted if key not in base_rows),
        altered={
            key: digest
            for key, (_, digest) in base_rows.items()
            if wanted.get(key, digest) != digest
        },
        dropped=tuple(key for key in base_rows if key not in wanted),
    )


def apply(
    session: Session,
    table: Content,
    collection_id: int,
    part: Difference,
    number: int,
    added: Iterable[Mapping[str, Any]],
) -> None:
    """Write the difference as edition `number`; `added` are the full rows of `part.add`."""
    for ids in _steps(part.close):
        session.execute(update(table).where(table.id.in_(ids)).values(until=number))
    columns = [
        column for column in table.__table__.c if column.name not in {"id", "first", "until"}
    ]
    names = [*(column.name for column in columns), "first"]
    for ids in _steps(part.again):
        copies = select(*columns, literal(number)).where(table.id.in_(ids))
        session.execute(insert(table).from_select(names, copies))
    _insert(session, table, {"collection_id": collection_id, "first": number}, added)


def _insert(
    session: Session, table: Content, own: Mapping[str, Any], rows: Iterable[Mapping[str, Any]]
) -> None:
    """Add rows, each with the values `own`: a column at a time made what the driver takes, which
    costs a fifth of having every value of every row looked at."""
    connection = session.connection()
    plain, dialect = cast(Table, table.__table__), connection.dialect
    for step in _steps(rows):
        columns = {name: [row[name] for row in step] for name in step[0]}
        columns |= {name: [value] * len(step) for name, value in own.items()}
        for name, values in columns.items():
            if made := plain.c[name].type.dialect_impl(dialect).bind_processor(dialect):
                columns[name] = [made(value) for value in values]
        written = insert(plain).compile(dialect=dialect, column_keys=list(columns))
        order = written.positiontup  # None: the driver takes its values by name
        across = list(zip(*(columns[name] for name in order or columns), strict=True))
        by_name = [] if order else [dict(zip(columns, row, strict=True)) for row in across]
        connection.exec_driver_sql(str(written), across if order else by_name)


def _rows(
    session: Session, table: Content, collection_id: int, number: int
) -> dict[RowKey, tuple[int, bytes]]:
    """Key -> (id, digest) of everything that holds in an edition."""
    if not number:
        return {}
    rows = session.execute(
        select(*(getattr(table, name) for name in table.KEY), table.id, table.digest).where(
            table.collection_id == collection_id, table.holds_in(number)
        )
    )
    return {tuple(row[:-2]): (row[-2], row[-1]) for row in rows}


def _steps(items: Iterable[Any]) -> Iterator[Sequence[Any]]:
    rest = iter(items)
    while step := list(islice(rest, STEP)):
        yield step
