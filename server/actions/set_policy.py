"""Set what a collection's small counts are released under: every edition gets its mask anew."""

import datetime as dt

from server.accounts.viewer import Right, Viewer
from server.actions.masking import masks_under
from server.disclosure.rounding import BASES
from server.store import collections, editions, masks, policies
from server.store.connect import Session, transaction
from server.store.errors import Refused, Stale
from server.store.masks import Kept
from server.store.records import Policy, Terms

LARGEST_THRESHOLD = 100
LEAST_THRESHOLD = 2


def set_policy(
    session: Session, *, collection: str, terms: Terms, note: str, by: Viewer, now: dt.datetime
) -> Policy:
    """The next policy of the collection with the masks of all its editions. What was shown until
    now may be withheld from now on.

    Raises: NotAllowed; Missing; Refused where the terms cannot be or the note is empty; Stale where
    an edition was made meanwhile.
    """
    by.require(Right.ADMINISTER)
    _require_possible(terms)
    if not note.strip():
        raise Refused(
            "A policy needs a note. Say why these terms; whoever reads the collection will see it."
        )
    collections.find(session, collection)
    first = policies.secret(session, collection, 1)
    secret = first or policies.new_secret()
    made = masks_under(session, collection, terms, secret)
    with transaction(session):
        policy = policies.write(
            session,
            collection,
            terms,
            by=by.name,
            note=note.strip(),
            at=now,
            secret="" if first else secret,
        )
        there = {one.number for one in editions.listing(session, collection)}
        if there != set(made) or (policy.number == 1) == bool(first):
            raise Stale(max(made, default=0), max(there, default=0))
        for number, kept in made.items():
            masks.write(session, collection, number, policy.number, kept, at=now)
    return policy


def effect_of(session: Session, collection: str, terms: Terms) -> dict[int, Kept]:
    """What these terms would withhold, by edition; nothing is written. Raises: Missing, Refused."""
    _require_possible(terms)
    collections.find(session, collection)
    return masks_under(session, collection, terms, policies.secret(session, collection, 1) or "-")


def _require_possible(terms: Terms) -> None:
    for name, value in (("threshold", terms.threshold), ("persons", terms.persons)):
        least = LEAST_THRESHOLD if name == "threshold" else 0
        if not least <= value <= LARGEST_THRESHOLD:
            raise Refused(
                "The {name} of a policy is {value}; it can be {least} to {most}.",
                name=name,
                value=value,
                least=least,
                most=LARGEST_THRESHOLD,
            )
    if terms.zeros not in ("shown", "withheld"):
        raise Refused(
            "Zeros are {value}; they can be shown or withheld.",
            value=terms.zeros,
        )
    if terms.base not in (0, *BASES):
        raise Refused(
            "Counts cannot be rounded to {value}; the base can be {bases}, or 0 to withhold.",
            value=terms.base,
            bases=", ".join(str(base) for base in BASES),
        )
    if terms.base and (terms.persons or terms.zeros == "withheld"):
        raise Refused(
            "Rounded counts cannot also be withheld among few people, or where nobody died: a nil"
            " may be a rounded count. Set the fewest people to 0 and let nil be shown."
        )
    if terms.causes not in ("whole", "none"):
        raise Refused(
            "Deaths by cause are {value}; they can be shown for the whole, or none.",
            value=terms.causes,
        )
    if terms.coarse_below < 0:
        raise Refused(
            "The size of areas cannot be below 0; found {value}.", value=terms.coarse_below
        )
