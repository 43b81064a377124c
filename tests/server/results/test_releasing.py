"""What comes through the door that counts are released by."""

from dataclasses import replace

import numpy as np
import pytest

from server.accounts.viewer import LOCAL
from server.actions import masking
from server.actions.set_policy import set_policy
from server.results.causes import CauseChoice
from server.results.keys import PopulationYear
from server.results.loading import Beside, load
from server.results.parted import hidden_causes
from server.results.releasing import FULL, released
from server.store import editions
from server.store.connect import Session, transaction
from server.store.records import Change, Key, Selection, Terms, Vector
from tests.factories import BASIS, NOON, cells, stored_collection, stored_edition
from tests.server.disclosure.counts import FLAT, LIST, drawn
from tests.server.disclosure.counts import by_cause as nation_by_cause

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


def test_under_a_policy_the_causes_of_the_whole_pass_through_their_mask(session: Session) -> None:
    counts = nation_by_cause(drawn(FLAT, seed=1), seed=1)
    deaths = {key: one for key, one in counts.items() if key.area in ("n", "a0")}
    stored_collection(session)
    change = Change("saltmarsh", 0, deaths, FLAT[:2], BASIS, causes=LIST)
    prepared = editions.prepare(session, change)
    with transaction(session):
        editions.write(session, prepared, by="a tester", note="", at=NOON)
    set_policy(session, collection="saltmarsh", terms=Terms(), note="Few.", by=LOCAL, now=NOON)
    later = replace(change, base=1, cells={}, areas=FLAT[:2])
    _committed(session, replace(later, cells=_as_of(deaths, "2002")))
    for number, periods in ((1, {"2001"}), (2, {"2001", "2002"})):
        found = released(session, "saltmarsh", number, EVERYTHING, "released")
        parts = {key: one for key, one in found.items() if key.cause}
        assert {(key.area, key.period) for key in parts} == {("n", year) for year in periods}
        small = [
            (key, age)
            for key, one in parts.items()
            if key in deaths
            for age, n in zip(one.grid.starts, deaths[key].values, strict=True)
            if 0 < n < 5
        ]
        assert small
        assert all(age in parts[key].withheld for key, age in small)


def _as_of(cells: dict[Key, Vector], year: str) -> dict[Key, Vector]:
    return {key._replace(period=year): one for key, one in cells.items()}


def _committed(session: Session, change: Change) -> None:
    prepared, made = editions.prepare(session, change), masking.mask_of(session, change)
    with transaction(session):
        edition = editions.write(session, prepared, by="a tester", note="", at=NOON)
        masking.keep(session, change, edition.number, made, at=NOON)


def test_cells_by_cause_that_only_stand_in_are_told_to_pages(session: Session) -> None:
    counts = nation_by_cause(drawn(FLAT, seed=1), seed=1)
    deaths = {key: one for key, one in counts.items() if key.area in ("n", "a0")}
    stored_collection(session)
    prepared = editions.prepare(
        session, Change("saltmarsh", 0, deaths, FLAT[:2], BASIS, causes=LIST)
    )
    with transaction(session):
        editions.write(session, prepared, by="a tester", note="", at=NOON)
    set_policy(session, collection="saltmarsh", terms=Terms(), note="Few.", by=LOCAL, now=NOON)
    of, beside = PopulationYear("n", "f", "2001"), Beside(causes=CauseChoice(level="causes"))
    whole, full = (
        load(session, "saltmarsh", 1, [of], beside, figures=figures)[of]
        for figures in ("released", "full")
    )
    listed = tuple(reversed(whole.causes.list)) if whole.causes else ()
    hidden = hidden_causes(whole, whole.panel.grid, listed)
    assert whole.causes is not None
    assert full.causes is not None
    assert whole.causes.list == full.causes.list
    small = (full.causes.counts.deaths[::-1] > 0) & (full.causes.counts.deaths[::-1] < 5)
    assert small.any()
    assert hidden[: len(small)][small].all()
    assert not hidden.all()
    assert not hidden_causes(full, full.panel.grid, listed).any()
