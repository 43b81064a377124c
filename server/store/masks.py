"""Masks: what of an edition is withheld under a policy. Made once, never updated."""

import datetime as dt
import hashlib
import json
import zlib
from collections.abc import Iterable
from collections.abc import Mapping as Lookup
from dataclasses import dataclass, field
from functools import lru_cache
from typing import Any

from sqlalchemy import Select, String, and_, cast, false, func, insert, literal, select, union_all
from sqlalchemy.orm import Session

from server.store import collections, policies, schedules, tables
from server.store.errors import Refused
from server.store.policies import read
from server.store.records import Hidden, Key, Mask, Selection, Terms, Unprotected, Vector


@dataclass(frozen=True, slots=True)
class Kept:
    """A mask as it is stored, and by period the small counts not protected as was asked."""

    mask: Mask
    unprotected: Lookup[str, Unprotected] = field(default_factory=dict)
    by_cause: frozenset[tuple[str, str]] = frozenset()  # areas and periods shown by cause as well

    @property
    def exposed(self) -> int:
        return sum(one.exposed for one in self.unprotected.values())

    @property
    def narrow(self) -> int:
        return sum(one.narrow for one in self.unprotected.values())

    @property
    def cells(self) -> int:
        """How many counts are withheld; sums over age are none of them."""
        return sum(age >= 0 for one in self.mask.values() if not one.rounded for age in one.ages)

    @property
    def rounded(self) -> int:
        """How many counts are rounded."""
        return sum(len(one.ages) for one in self.mask.values() if one.rounded)


@dataclass(frozen=True, slots=True)
class Protected:
    """The terms an edition is released under, and its mask."""

    terms: Terms
    kept: Kept


_MASK = "mask"  # measure of the row that brings the mask along


def released(
    session: Session, collection: str, edition: int, selection: Selection
) -> tuple[dict[Key, Vector], Protected | None]:
    """The selected schedules of an edition as they are, and what protects them under the policy
    that holds (None: there is no policy). One statement, so that nobody reads the one without the
    other. Raises: Refused where the policy has no mask for the edition: nothing can be shown."""
    both = union_all(
        schedules.statement(collection, edition, selection), _mask(collection, edition)
    )
    rows = session.execute(both).all()
    cells = schedules.of_rows(row for row in rows if row.measure != _MASK)
    found = next((row for row in rows if row.measure == _MASK), None)
    if found is None:
        return cells, None
    if not found.vector:
        raise _no_mask(collection, edition)
    return cells, Protected(read(found.status), unpacked(found.vector))


def _no_mask(collection: str, edition: int) -> Refused:
    return Refused(
        "Edition {edition} has no mask under the policy that holds, so that nothing of it can be"
        " released. Set the policy of {collection} again.",
        edition=edition,
        collection=collection,
    )


def _mask(collection: str, edition: int) -> Select[*tuple[Any, ...]]:
    """The mask under the newest policy, as a row in the columns of schedules."""
    policy, mask = tables.Policy, tables.Mask
    of = collections.id_of(collection)
    newest = select(func.max(policy.number)).where(policy.collection_id == of).scalar_subquery()
    empty = cast(literal(""), String)
    return (
        select(
            empty.label("area"),
            empty.label("sex"),
            empty.label("period"),
            cast(literal(_MASK), String).label("measure"),
            empty.label("cause"),
            policy.terms.label("status"),
            empty.label("starts"),
            mask.content.label("vector"),
            false().label("estimated"),
        )
        .outerjoin(
            mask,
            and_(
                mask.collection_id == policy.collection_id,
                mask.policy == policy.number,
                mask.edition == edition,
            ),
        )
        .where(policy.collection_id == of, policy.number == newest)
    )


def find(session: Session, collection: str, editions: Iterable[int]) -> dict[int, Protected]:
    """What protects these editions under the policy that holds, by number; empty where there is no
    policy. One statement. Raises: Refused where the policy lacks a mask of one of them."""
    wanted = tuple(editions)
    policy, mask = tables.Policy, tables.Mask
    of = collections.id_of(collection)
    newest = select(func.max(policy.number)).where(policy.collection_id == of).scalar_subquery()
    rows = session.execute(
        select(policy.terms, mask.edition, mask.content)
        .outerjoin(
            mask,
            and_(
                mask.collection_id == policy.collection_id,
                mask.policy == policy.number,
                mask.edition.in_(wanted),
            ),
        )
        .where(policy.collection_id == of, policy.number == newest)
    ).all()
    found = {
        row.edition: Protected(read(row.terms), unpacked(row.content))
        for row in rows
        if row.content
    }
    for number in wanted if rows else ():
        if number not in found:
            raise _no_mask(collection, number)
    return found


def of_editions(session: Session, collection: str, policy: int) -> dict[int, Kept]:
    """The masks of all editions under one policy, by number. One statement."""
    row = tables.Mask
    rows = session.execute(
        select(row.edition, row.content).where(
            row.collection_id == collections.id_of(collection), row.policy == policy
        )
    ).all()
    return {one.edition: unpacked(one.content) for one in sorted(rows, key=lambda one: one.edition)}


def write(
    session: Session, collection: str, edition: int, policy: int, kept: Kept, *, at: dt.datetime
) -> None:
    """Keep a mask, inside a transaction after its edition and policy. Its digest stands for both
    the edition's counts and the mask to whoever reads what is released."""
    content = packed(kept)
    row = tables.Edition
    counts = session.scalar(
        select(row.digest).where(
            row.collection_id == collections.id_of(collection), row.number == edition
        )
    )
    with_secret = (policies.secret(session, collection, policy), counts or "")
    digest = hashlib.sha256("\n".join(with_secret).encode() + zlib.decompress(content))
    session.execute(
        insert(tables.Mask).values(
            collection_id=collections.id_of(collection),
            edition=edition,
            policy=policy,
            digest=digest.hexdigest(),
            content=content,
            made=at,
        )
    )


def packed(kept: Kept) -> bytes:
    """One spelling for each mask."""
    rows: list[list[Any]] = [
        [
            *_codes(key),
            list(one.ages),
            list(one.values),
            list(one.starts),
            *([one.rounded] if one.rounded else []),
        ]
        for key, one in sorted(kept.mask.items())
    ]
    left = {period: [one.exposed, one.narrow] for period, one in sorted(kept.unprotected.items())}
    shown = {"by_cause": sorted(kept.by_cause)} if kept.by_cause else {}
    text = json.dumps({"unprotected": left, "hidden": rows} | shown)
    return zlib.compress(text.encode(), 6)


def _codes(key: Key) -> tuple[str, ...]:
    return key.area, key.sex, key.period, key.measure, key.cause


@lru_cache(maxsize=16)
def unpacked(content: bytes) -> Kept:
    """The mask in stored bytes. (Many pages ask for the same one.)"""
    stored: Lookup[str, Any] = json.loads(zlib.decompress(content))
    mask = {
        Key(*row[:5]): Hidden(tuple(row[5]), tuple(row[6]), tuple(row[7]), *row[8:])
        for row in stored["hidden"]
    }
    left = {period: Unprotected(*numbers) for period, numbers in stored["unprotected"].items()}
    return Kept(
        mask, left, frozenset((area, period) for area, period in stored.get("by_cause", ()))
    )
