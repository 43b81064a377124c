"""Opening a collection."""

import pytest
from sqlalchemy.orm import Session

from server.accounts.viewer import LOCAL, NotAllowed, Right, Viewer
from server.actions.create_collection import create_collection
from server.store import collections
from server.store.errors import Refused, Taken
from server.store.records import Collection
from tests.factories import NOON


def create(session: Session, code: str, *, name: str = "Deaths", by: Viewer = LOCAL) -> Collection:
    return create_collection(session, code=code, name=name, owner=" Desk ", by=by, now=NOON)


def test_a_collection_is_opened_once(session: Session) -> None:
    made = create(session, "saltmarsh")
    assert (made.code, made.name, made.owner, made.revision) == ("saltmarsh", "Deaths", "Desk", 0)
    assert collections.all_collections(session) == (made,)
    with pytest.raises(Taken, match="There is a collection saltmarsh already"):
        create(session, "saltmarsh")


@pytest.mark.parametrize("code", ["two words", "a/b", "é", "x" * 33, ".", "..", "a\n"])
def test_a_code_that_cannot_stand_in_an_address_is_refused(session: Session, code: str) -> None:
    with pytest.raises(Refused, match="expected 1 to 32 of the letters a to z"):
        create(session, code)
    assert collections.all_collections(session) == ()


def test_a_new_collection_needs_a_code(session: Session) -> None:
    with pytest.raises(Refused, match="needs a code"):
        create(session, "")


@pytest.mark.parametrize("code", ["A.b_c-9", "x" * 32, "..a"])
def test_a_code_of_allowed_signs_is_taken(session: Session, code: str) -> None:
    assert create(session, code).code == code


def test_name_and_right_are_needed(session: Session) -> None:
    with pytest.raises(Refused, match="The collection a needs a name and an owner"):
        create(session, "a", name=" ")
    with pytest.raises(NotAllowed, match="may not administer here"):
        create(session, "a", by=Viewer("x", frozenset({Right.UPLOAD})))
