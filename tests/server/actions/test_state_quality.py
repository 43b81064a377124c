"""What is stated of an edition's quality is added, never changed."""

import datetime as dt

import pytest

from server.accounts.viewer import LOCAL, NotAllowed, Right, Viewer
from server.actions.state_quality import state_quality
from server.store import collections, statements
from server.store.connect import Session
from server.store.errors import Missing, Refused
from server.store.statements import LONGEST, QUESTIONS
from tests.factories import NOON, cells, stored_collection, stored_edition


@pytest.fixture(autouse=True)
def edition(session: Session) -> None:
    stored_collection(session)
    stored_edition(session, cells())


def state(
    session: Session, *, number: int = 1, by: Viewer = LOCAL, hours: int = 0, **said: str
) -> None:
    state_quality(
        session,
        collection="saltmarsh",
        number=number,
        answers=said,
        by=by,
        now=NOON + dt.timedelta(hours=hours),
    )


def test_the_newest_statement_comes_first_and_all_are_kept(session: Session) -> None:
    assert statements.listing(session, "saltmarsh", 1) == ()
    state(session, source=" Civil \n registers ", contact="desk@isle")
    state(session, hours=1, source="Civil registers, coded by hand")
    newest, first = statements.listing(session, "saltmarsh", 1)
    assert newest.answers == {"source": "Civil registers, coded by hand"}
    assert first.answers == {"source": "Civil registers", "contact": "desk@isle"}
    assert (first.by, first.at, newest.at) == (LOCAL.name, NOON, NOON + dt.timedelta(hours=1))


def test_a_statement_is_of_its_edition_and_moves_the_tags(session: Session) -> None:
    stored_edition(session, cells(years=(2002,)))
    before = collections.find(session, "saltmarsh").revision
    state(session, number=2, faults="None known")
    assert statements.listing(session, "saltmarsh", 1) == ()
    assert len(statements.listing(session, "saltmarsh", 2)) == 1
    assert collections.find(session, "saltmarsh").revision == before + 1


def test_what_is_refused_leaves_nothing(session: Session) -> None:
    with pytest.raises(Refused, match="Nothing is stated"):
        state(session, source="  ")
    with pytest.raises(Refused, match=f"at most {LONGEST:} are kept"):
        state(session, source="x" * (LONGEST + 1))
    with pytest.raises(Missing, match="7"):
        state(session, number=7, source="x")
    with pytest.raises(ValueError, match="are no questions"):
        state(session, colour="red")
    with pytest.raises(NotAllowed):
        state(session, by=Viewer("a reader", frozenset({Right.READ})), source="x")
    assert statements.listing(session, "saltmarsh", 1) == ()
    state(session, **dict.fromkeys(QUESTIONS, "x" * LONGEST))
