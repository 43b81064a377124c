"""Masks of editions: made before any lock is taken, written in the same transaction as these."""

import datetime as dt
from collections.abc import Mapping
from dataclasses import dataclass, replace

from server.disclosure.masking import Content, mask
from server.store import areas, causes, changes, editions, masks, policies
from server.store.connect import Session
from server.store.errors import Stale
from server.store.masks import Kept
from server.store.records import Area, Cause, Change, Key, Policy, Selection, Terms, Vector


@dataclass(frozen=True, slots=True)
class Masked:
    """The mask of an edition that is about to be made."""

    policy: Policy
    kept: Kept
    known: tuple[int, ...]  # editions it was made beside


def mask_of(session: Session, change: Change) -> Masked | None:
    """What of the edition to be is withheld; None where the collection has no policy."""
    policy = policies.newest(session, change.collection)
    if policy is None:
        return None
    known = [one.number for one in editions.listing(session, change.collection)]
    stood = areas.listing(session, change.collection, change.base) if change.base else ()
    lists = causes.of_editions(session, change.collection, known)
    listed = _listed(change, lists.get(change.base, ()))
    touched = {key.period for key in (*change.cells, *change.ended)}
    whole = (
        change.replace
        or _tree(stood) != _tree(change.areas)
        or _causes(listed) != _causes(lists.get(change.base, ()))
    )
    chosen = Selection(periods=None if whole else tuple(sorted(touched)), cause=None)
    history = changes.versions(session, change.collection, max(known, default=0), chosen)
    trees = changes.tree(session, change.collection, known)
    before = masks.of_editions(session, change.collection, policy.number)
    earlier = [
        _content(trees[number], _held(history, number), before[number], lists[number])
        for number in sorted(known)
    ]
    otherwise = _shown_otherwise(session, change.collection, policy.number, trees, lists, history)
    base = {} if change.replace or not change.base else _held(history, change.base)
    cells = {key: cell for key, cell in base.items() if key not in change.ended}
    made = mask(
        change.areas,
        cells | dict(change.cells),
        policy.terms,
        earlier,
        otherwise,
        secret=policies.secret(session, change.collection, 1),
        causes=listed,
    )
    kept, left, shown = dict(made.mask), dict(made.unprotected), set(made.by_cause)
    if not whole and change.base:
        stays = before[change.base]
        kept |= {key: one for key, one in stays.mask.items() if key.period not in touched}
        left |= {year: one for year, one in stays.unprotected.items() if year not in touched}
        shown |= {place for place in stays.by_cause if place[1] not in touched}
    return Masked(policy, Kept(kept, left, frozenset(shown)), tuple(sorted(known)))


def keep(
    session: Session, change: Change, number: int, masked: Masked | None, *, at: dt.datetime
) -> None:
    """Write the mask of the edition just made, inside its transaction. Raises: Stale where the
    policy, or an edition it was made beside, is another by now."""
    policy = policies.newest(session, change.collection)
    before = tuple(
        sorted(
            one.number
            for one in editions.listing(session, change.collection)
            if one.number != number
        )
    )
    if masked is None and policy is None:
        return
    if masked is None or policy != masked.policy or before != masked.known:
        raise Stale(max(masked.known, default=0) if masked else 0, max(before, default=0))
    masks.write(session, change.collection, number, policy.number, masked.kept, at=at)


def masks_under(session: Session, collection: str, terms: Terms, secret: str) -> dict[int, Kept]:
    """The masks of all editions as these terms would have them, by number; `secret` is what counts
    are rounded with."""
    numbers = sorted(one.number for one in editions.listing(session, collection))
    history = changes.versions(session, collection, max(numbers, default=0), Selection(cause=None))
    trees = changes.tree(session, collection, numbers)
    lists = causes.of_editions(session, collection, numbers)
    otherwise = _shown_otherwise(session, collection, 0, trees, lists, history)
    earlier: list[Content] = []
    found: dict[int, Kept] = {}
    for number in numbers:
        cells = _held(history, number)
        listed = lists[number]
        made = mask(trees[number], cells, terms, earlier, otherwise, secret=secret, causes=listed)
        found[number] = Kept(made.mask, made.unprotected, made.by_cause)
        earlier.append(_content(trees[number], cells, found[number], listed))
    return found


def _shown_otherwise(
    session: Session,
    collection: str,
    policy: int,
    trees: Mapping[int, tuple[Area, ...]],
    lists: Mapping[int, tuple[Cause, ...]],
    history: Mapping[Key, tuple[changes.Held, ...]],
) -> list[Content]:
    """The editions as all policies but this one showed them, the first policy first."""
    others = [one for one in policies.listing(session, collection) if one.number != policy]
    return [
        replace(
            _content(trees[number], _held(history, number), kept, lists[number]), terms=other.terms
        )
        for other in others[::-1]
        for number, kept in masks.of_editions(session, collection, other.number).items()
    ]


def _content(
    tree: tuple[Area, ...], cells: Mapping[Key, Vector], kept: Kept, listed: tuple[Cause, ...]
) -> Content:
    return Content(tree, cells, kept.mask, kept.unprotected, causes=listed, by_cause=kept.by_cause)


def _listed(change: Change, base: tuple[Cause, ...]) -> tuple[Cause, ...]:
    """The cause list of the edition to be."""
    together = {} if change.replace else {one.code: one for one in base}
    together |= {one.code: one for one in change.causes}
    return tuple(one for code, one in together.items() if code not in change.ended_causes)


def _causes(of: tuple[Cause, ...]) -> set[tuple[str, str]]:
    return {(one.code, one.parent) for one in of}


def _held(history: Mapping[Key, tuple[changes.Held, ...]], number: int) -> dict[Key, Vector]:
    return {
        key: one.vector for key, ones in history.items() for one in ones if one.holds_in(number)
    }


def _tree(of: tuple[Area, ...]) -> set[tuple[str, str, bool]]:
    return {(one.code, one.parent, one.delivered) for one in of}
