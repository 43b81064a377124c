"""What differs between two editions, against both read in full; and where editions come from."""

from collections.abc import Callable
from contextlib import AbstractContextManager
from itertools import permutations

import numpy as np
import pytest
from sqlalchemy.orm import Session

from server.store import changes, digests, schedules
from server.store.records import Key, Selection, Vector
from tests.factories import cells, stored_collection, stored_edition, withdrawn

EVERYTHING = Selection(cause=None)


@pytest.fixture
def marsh(session: Session) -> Session:
    """Editions that add, change, restate, take back and replace; the third was withdrawn."""
    stored_collection(session)
    stored_edition(session, cells("ab", years=(2001, 2002)))
    stored_edition(session, cells("a", years=(2001,), times=2.0))
    stored_edition(session, cells("b", years=(2001, 2002), status="provisional"))
    withdrawn(session, 3)
    stored_edition(session, cells("ab", years=(2001, 2002)))  # as the first: rows hold again
    stored_edition(session, cells("c"), replace=True)
    return session


def digest(key: Key, vector: Vector | None) -> bytes:
    return b"" if vector is None else digests.of_schedule(key, vector)


def test_every_pair_differs_as_read_in_full(
    marsh: Session, count_statements: Callable[[], AbstractContextManager[list[str]]]
) -> None:
    held = {n: schedules.load(marsh, "saltmarsh", n, EVERYTHING) for n in range(1, 6)}
    for then, now in permutations(held, 2):
        with count_statements() as statements:
            found = changes.differing(marsh, "saltmarsh", then, now)
        assert len(statements) == 1
        keys = held[then].keys() | held[now].keys()
        pairs = {key: (held[then].get(key), held[now].get(key)) for key in keys}
        wanted = {
            key: pair for key, pair in pairs.items() if digest(key, pair[0]) != digest(key, pair[1])
        }
        assert list(found) == sorted(wanted)
        for key, pair in wanted.items():
            for side, other in zip(found[key], pair, strict=True):
                assert digest(key, side) == digest(key, other)
    assert changes.differing(marsh, "saltmarsh", 1, 4) == {}


def test_the_line_goes_by_what_editions_were_built_on(marsh: Session) -> None:
    lines = [changes.lineage(marsh, "saltmarsh", number) for number in range(1, 6)]
    assert lines == [(1,), (2, 1), (3, 2, 1), (4, 2, 1), (5, 4, 2, 1)]
    assert changes.lineage(marsh, "saltmarsh", 9) == ()


def test_versions_come_in_the_order_of_their_editions(marsh: Session) -> None:
    chosen = Selection(areas=("a",), periods=("2001",), measures=("deaths",))
    found = changes.versions(marsh, "saltmarsh", 5, chosen)
    assert set(found) == {Key("a", sex, "2001", "deaths") for sex in "fm"}
    held = found[Key("a", "f", "2001", "deaths")]
    assert [(one.first, one.until) for one in held] == [(1, 2), (2, 4), (4, 5)]
    np.testing.assert_array_equal(held[1].vector.values, 2 * held[0].vector.values)
    assert held[0].digest == held[2].digest
    assert (
        len(changes.versions(marsh, "saltmarsh", 1, chosen)[Key("a", "f", "2001", "deaths")]) == 1
    )


def test_what_was_provisional_in_the_line_alone_counts(session: Session) -> None:
    stored_collection(session)
    stored_edition(session, cells("a", status="provisional") | cells("b"))
    stored_edition(session, cells("b", status="provisional", times=3.0))
    withdrawn(session, 2)
    stored_edition(session, cells("a", times=2.0))
    found = changes.once_provisional(session, "saltmarsh", 3, ("deaths",))
    once = {
        key.area
        for key, all_ in found.items()
        if any(held.vector.status == "provisional" for _since, held in all_)
    }
    assert once == {"a"}
    (first, old), (second, new) = found[Key("a", "f", "2001", "deaths")]
    assert (first, old.vector.status, second, new.vector.status) == (1, "provisional", 3, "final")
    assert changes.once_provisional(session, "saltmarsh", 1, ("deaths",)) == {}
