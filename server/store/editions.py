"""Editions: immutable states of a collection, and the events that befall them."""

import datetime as dt
import json
from collections.abc import Iterable, Mapping
from dataclasses import asdict, dataclass, replace
from itertools import groupby
from typing import Any, Literal

from sqlalchemy import ColumnElement, SQLColumnExpression, and_, func, insert, select
from sqlalchemy.orm import Session, aliased

from server.store import collections, digests, ranges, rows
from server.store.base import LARGEST
from server.store.errors import Missing, Refused, Stale
from server.store.records import (
    ALL_OF_IT,
    STATUSES,
    Basis,
    Change,
    Collection,
    Edition,
    Effect,
    Event,
    Key,
    Taking,
)
from server.store.tables import (
    AreaRange,
    BasisRange,
    BreakRange,
    CauseRange,
    EditionEvent,
    Schedule,
)
from server.store.tables import Edition as EditionRow


@dataclass(frozen=True, slots=True)
class Prepared:
    """A change, and what it alters in the tables. Made without a lock."""

    change: Change
    packed: Mapping[Key, digests.Packed]  # its cells, as they are stored
    collection: Collection
    highest: int  # the number it was compared with
    schedules: ranges.Difference
    areas: ranges.Difference
    basis: ranges.Difference
    breaks: ranges.Difference
    causes: ranges.Difference

    @property
    def digest(self) -> str:
        parts = (self.schedules, self.areas, self.basis, self.breaks, self.causes)
        return digests.of_edition(one for part in parts for one in part.digests)

    @property
    def effect(self) -> Effect:
        """What the edition does to the schedules of its base."""
        altered = self.schedules.altered
        restated = sum(
            altered[key] == digests.of_schedule(key, replace(cell, status=status))
            for key, cell in (self.change.cells.items() if altered else ())
            if key in altered
            for status in STATUSES
            if status != cell.status
        )
        return Effect(
            added=len(self.schedules.fresh),
            changed=len(altered) - restated,
            restated=restated,
            dropped=len(self.schedules.dropped),
        )


def find(session: Session, collection: str, number: int) -> Edition | None:
    """One edition with its events, or None. One statement."""
    if not 0 < number <= LARGEST:
        return None
    found = _read(session, collection, EditionRow.number == number)
    return found[0] if found else None


def listing(session: Session, collection: str) -> tuple[Edition, ...]:
    """All editions, newest first. One statement."""
    return _read(session, collection)


def newest_standing(session: Session, collection: str) -> Edition | None:
    """The edition a visitor without a number is sent to. One statement."""
    newest = standing_number(collections.id_of(collection))
    found = _read(session, collection, EditionRow.number == newest)
    return found[0] if found else None


def require_base(session: Session, collection: str, base: int) -> None:
    """Refuse where another edition stands than `base` (0: none); nobody else can change that
    before the transaction ends. Raises: Missing, Stale."""
    locked = collections.lock(session, collection)
    standing = session.scalar(select(standing_number(locked.id))) or 0
    if standing != base:
        raise Stale(base, standing)


def prepare(session: Session, change: Change) -> Prepared:
    """Digest the change and compare it with what is stored; takes no lock. Raises: Missing."""
    collection = collections.find(session, change.collection)
    against = ranges.highest(session, collection.id)

    def compared(table: type[Any], handed: dict[tuple[str, ...], bytes], ended: Any = ()) -> Any:
        return ranges.difference(
            session,
            table,
            collection.id,
            base=change.base,
            against=against,
            handed=handed,
            ended=ended,
            replace=change.replace,
        )

    packed = digests.packed(change.cells)
    cells: dict[tuple[str, ...], bytes] = {key: one.digest for key, one in packed.items()}
    return Prepared(
        change,
        packed,
        collection,
        against,
        schedules=compared(Schedule, cells, change.ended),
        areas=compared(
            AreaRange,
            {(area.code,): digests.of_area(area) for area in change.areas},
            frozenset((code,) for code in change.ended_areas),
        ),
        basis=compared(BasisRange, {(): digests.of_basis(change.basis)}),
        breaks=compared(
            BreakRange,
            {rows.of_break(one): digests.of_break(one) for one in change.breaks},
            frozenset(map(rows.of_break, change.ended_breaks)),
        ),
        causes=compared(
            CauseRange,
            {(cause.code,): digests.of_cause(cause) for cause in change.causes},
            frozenset((code,) for code in change.ended_causes),
        ),
    )


def write(session: Session, prepared: Prepared, *, by: str, note: str, at: dt.datetime) -> Edition:
    """Write a prepared change as the next edition, inside a transaction after `require_base`."""
    change, collection = prepared.change, prepared.collection
    highest = ranges.highest(session, collection.id)
    if highest != prepared.highest:  # an edition was made and withdrawn meanwhile: compare again
        prepared = prepare(session, change)
    number = highest + 1
    session.execute(
        insert(EditionRow).values(
            collection_id=collection.id,
            number=number,
            base=change.base,
            replaces=change.replace,
            made=at,
            by=by,
            note=note,
            digest=prepared.digest,
            upload_id=change.upload,
            taking="" if change.taking == ALL_OF_IT else json.dumps(asdict(change.taking)),
            effect=json.dumps(asdict(prepared.effect)),
        )
    )
    for table, part, added in (
        (
            Schedule,
            prepared.schedules,
            rows.schedules(session, prepared.schedules.add, change, prepared.packed),
        ),
        (AreaRange, prepared.areas, rows.areas(prepared.areas.add, change)),
        (BasisRange, prepared.basis, rows.basis(prepared.basis.add, change)),
        (BreakRange, prepared.breaks, rows.breaks(prepared.breaks.add, change)),
        (CauseRange, prepared.causes, rows.causes(prepared.causes.add, change)),
    ):
        ranges.apply(session, table, collection.id, part, number, added)
    rows.name_areas(session, collection.id, change.areas)
    rows.label_causes(session, collection.id, change.causes)
    collections.touch(session, collection.id)
    return _certain(session, collection.code, number)


def record_event(
    session: Session,
    collection: str,
    number: int,
    what: Literal["withdrawn", "reinstated"],
    *,
    by: str,
    note: str,
    at: dt.datetime,
) -> Edition:
    """Withdraw or reinstate, inside a transaction. Raises: Missing; Refused where it is so."""
    locked = collections.lock(session, collection)
    edition = _certain(session, collection, number)
    if edition.withdrawn == (what == "withdrawn"):
        raise Refused(
            "Edition {edition} is withdrawn already."
            if edition.withdrawn
            else "Edition {edition} was not withdrawn; it stands.",
            edition=number,
        )
    session.execute(
        insert(EditionEvent).values(
            collection_id=locked.id, number=number, what=what, at=at, by=by, note=note
        )
    )
    collections.touch(session, locked.id)
    return _certain(session, collection, number)


def standing_number(collection_id: SQLColumnExpression[int] | int) -> Any:
    """The number of the newest edition that is not withdrawn, inside another statement."""
    one = aliased(EditionRow)  # a name of its own: the statement around it may read editions too
    event = aliased(EditionEvent)
    last = (
        select(event.what)
        .where(event.collection_id == one.collection_id, event.number == one.number)
        .order_by(event.id.desc())
        .limit(1)
        .correlate(one)
        .scalar_subquery()
    )
    return (
        select(func.max(one.number))
        .where(one.collection_id == collection_id, func.coalesce(last, "") != "withdrawn")
        .scalar_subquery()
    )


# what an edition is read from, one row an event: see `of_rows`
COLUMNS = (
    EditionRow.number,
    EditionRow.base,
    EditionRow.made,
    EditionRow.by,
    EditionRow.note,
    EditionRow.digest,
    EditionRow.upload_id,
    EditionRow.replaces,
    EditionRow.taking,
    EditionRow.effect,
    BasisRange.people,
    BasisRange.dated_by,
    BasisRange.population,
    BasisRange.population_date,
    BasisRange.source,
    BasisRange.vintage,
    EditionEvent.id.label("event"),
    EditionEvent.what,
    EditionEvent.at.label("event_at"),
    EditionEvent.by.label("event_by"),
    EditionEvent.note.label("event_note"),
)
ITS_BASIS = and_(
    BasisRange.collection_id == EditionRow.collection_id, BasisRange.holds_in(EditionRow.number)
)
ITS_EVENTS = and_(
    EditionEvent.collection_id == EditionRow.collection_id,
    EditionEvent.number == EditionRow.number,
)


def of_rows(found: Iterable[Any]) -> tuple[Edition, ...]:
    """Editions from rows of COLUMNS, newest first; events in the order they befell."""
    ordered = sorted(found, key=lambda row: (-row.number, row.event or 0))
    return tuple(
        _of_rows(list(of_one)) for _, of_one in groupby(ordered, key=lambda row: row.number)
    )


def _of_rows(found: list[Any]) -> Edition:
    row = found[0]
    return Edition(
        number=row.number,
        base=row.base,
        made=row.made,
        by=row.by,
        note=row.note,
        digest=row.digest,
        upload=row.upload_id,
        replaces=row.replaces,
        basis=Basis(
            row.people,
            row.dated_by,
            row.population,
            row.population_date,
            row.source,
            row.vintage,
        ),
        events=tuple(
            Event(event.what, event.event_at, event.event_by, event.event_note)
            for event in found
            if event.event is not None
        ),
        taking=_taking(row.taking) if row.taking else _whole(replaces=row.replaces),
        effect=Effect(**json.loads(row.effect)) if row.effect else None,
    )


def _whole(*, replaces: bool) -> Taking:
    """What was taken where nothing is said of it: all of the upload."""
    return Taking(gives_way="all") if replaces else ALL_OF_IT


def _taking(text: str) -> Taking:
    stored = json.loads(text)
    return Taking(tuple(stored["areas"]), tuple(stored["periods"]), stored["gives_way"])


def _read(
    session: Session, collection: str, which: ColumnElement[bool] | None = None
) -> tuple[Edition, ...]:
    statement = (
        select(*COLUMNS)
        .join(BasisRange, ITS_BASIS)
        .outerjoin(EditionEvent, ITS_EVENTS)
        .where(EditionRow.collection_id == collections.id_of(collection))
    )
    if which is not None:
        statement = statement.where(which)
    return of_rows(session.execute(statement))


def _certain(session: Session, collection: str, number: int) -> Edition:
    edition = find(session, collection, number)
    if edition is None:
        known = [one.number for one in listing(session, collection)]
        raise Missing("edition", number, known)
    return edition
