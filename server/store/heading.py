"""What stands over every pinned page, and all that an unchanged page must know: one statement."""

from dataclasses import dataclass, replace
from typing import Self

from sqlalchemy import and_, bindparam, func, select
from sqlalchemy.orm import Session

from server.store import collections, editions
from server.store.base import LARGEST
from server.store.errors import Missing
from server.store.records import Collection as CollectionRecord
from server.store.records import Edition as EditionRecord
from server.store.tables import (
    BasisRange,
    CauseRange,
    Collection,
    Edition,
    EditionEvent,
    Mask,
    Policy,
)

_POLICY = (
    select(func.max(Policy.number))
    .where(Policy.collection_id == Collection.id)
    .correlate(Collection)
    .scalar_subquery()
)
_CAUSES = (
    select(CauseRange.id)
    .where(CauseRange.collection_id == Collection.id, CauseRange.holds_in(bindparam("number")))
    .correlate(Collection)
    .exists()
)
# made once: putting the statement together takes longer than running it
_STATEMENT = (
    select(
        Collection.id.label("collection_id"),
        Collection.code,
        Collection.name,
        Collection.owner,
        Collection.revision,
        Collection.made.label("opened"),
        editions.standing_number(Collection.id).label("newest"),
        _POLICY.label("policy"),
        Mask.digest.label("mask"),
        _CAUSES.label("causes"),
        *editions.COLUMNS,
    )
    .outerjoin(
        Edition,
        and_(Edition.collection_id == Collection.id, Edition.number == bindparam("number")),
    )
    .outerjoin(
        Mask,
        and_(
            Mask.collection_id == Collection.id,
            Mask.edition == Edition.number,
            Mask.policy == _POLICY,
        ),
    )
    .outerjoin(BasisRange, editions.ITS_BASIS)
    .outerjoin(EditionEvent, editions.ITS_EVENTS)
    .where(Collection.code == bindparam("code"))
)


@dataclass(frozen=True, slots=True)
class Heading:
    collection: CollectionRecord
    edition: EditionRecord
    newest: int | None  # number of the newest standing edition; None: all are withdrawn
    policy: int | None = None  # number of the policy that holds; None: everything is shown
    mask: str = ""  # digest of the edition and its mask under that policy
    causes: bool = False  # whether the edition has a cause list

    @property
    def released(self) -> Self:
        """The same for those who may not know what is withheld: the digest of the counts would let
        them try whether a guess is right, that of the mask is made with a secret."""
        if self.policy is None:
            return self
        return replace(self, edition=replace(self.edition, digest=self.mask))


def heading(session: Session, collection_code: str, number: int) -> Heading:
    """Collection, edition with its events, and the newest standing number. One statement.

    Raises: Missing, for the collection or the edition, with those there are.
    """
    possible = 0 < number <= LARGEST and "\0" not in collection_code
    asked = {"code": collection_code, "number": number}
    rows = session.execute(_STATEMENT, asked).all() if possible else []
    if not rows or rows[0].number is None:
        collections.find(session, collection_code)  # raises where that is what is missing
        known = [one.number for one in editions.listing(session, collection_code)]
        raise Missing("edition", number, known)
    row = rows[0]
    return Heading(
        CollectionRecord(
            row.collection_id, row.code, row.name, row.owner, row.revision, row.opened
        ),
        editions.of_rows(rows)[0],
        row.newest,
        row.policy,
        row.mask or "",
        bool(row.causes),
    )
