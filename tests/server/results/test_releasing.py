"""What comes through the door that counts are released by."""

import numpy as np
import pytest

from server.accounts.viewer import LOCAL
from server.actions.set_policy import set_policy
from server.results.releasing import FULL, released
from server.store.connect import Session
from server.store.records import Key, Selection, Terms, Vector
from tests.factories import NOON, cells, stored_collection, stored_edition

EVERYTHING = Selection(cause=None)


def by_cause(cause: str) -> dict[Key, Vector]:
    """Deaths of one cause beside deaths and person-years of all."""
    held = cells("a")
    return held | {
        key._replace(cause=cause): vector for key, vector in held.items() if key.measure == "deaths"
    }


@pytest.mark.parametrize("policy", [False, True])
def test_deaths_by_cause_never_pass_without_a_mask_of_their_own(
    session: Session, policy: bool
) -> None:
    stored_collection(session)
    stored_edition(session, by_cause("c1"))
    if policy:
        set_policy(session, collection="saltmarsh", terms=Terms(), note="Few.", by=LOCAL, now=NOON)
    found = released(session, "saltmarsh", 1, EVERYTHING, "released")
    full = released(session, "saltmarsh", 1, EVERYTHING, FULL)
    assert {key.cause for key in full} == {"", "c1"}
    assert {key.cause for key in found} == ({""} if policy else {"", "c1"})
    for key in found:
        assert np.array_equal(found[key].values, full[key].values)
