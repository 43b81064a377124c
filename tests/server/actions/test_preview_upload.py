"""What is said before an edition is made is what the edition then does."""

from dataclasses import replace

import numpy as np
import pytest
from sqlalchemy.orm import Session

from server.accounts.viewer import LOCAL, NotAllowed, Viewer
from server.actions.commit_upload import commit_upload
from server.actions.preview_upload import preview_upload
from server.results.preview import Preview
from server.store import editions, schedules
from server.store.errors import Stale
from server.store.records import ALL_OF_IT, GIVES_WAY, Key, Selection, Taking
from tests.factories import COLUMNS, NOON, checked_upload, counts_csv, stored_collection

WHOLE = replace(COLUMNS, whole="isle")
CHOICES = [Taking(gives_way=choice) for choice in GIVES_WAY] + [
    Taking(areas=("north",)),
    Taking(periods=("2002",), gives_way="years"),
]


@pytest.fixture(autouse=True)
def first(session: Session) -> None:
    stored_collection(session)
    upload = checked_upload(session, counts_csv(), mapping=WHOLE)
    commit_upload(session, upload_id=upload.id, note="n", by=LOCAL, now=NOON)


def shown(session: Session, upload: int, taking: Taking = ALL_OF_IT) -> Preview:
    found = preview_upload(session, upload_id=upload, taking=taking, by=LOCAL)
    assert found is not None
    return found


@pytest.mark.parametrize("taking", CHOICES, ids=str)
def test_it_tells_what_the_commit_does(session: Session, taking: Taking) -> None:
    """Both sides of every total are summed here anew from the editions themselves."""
    content = counts_csv(["north"], years=(2002, 2003), times=7)
    upload = checked_upload(session, content, mapping=WHOLE)
    told = shown(session, upload.id, taking)
    edition = commit_upload(
        session, upload_id=upload.id, note="n", by=LOCAL, now=NOON, taking=taking
    )
    assert told.schedules == edition.effect
    sides = [schedules.load(session, "saltmarsh", n, Selection(cause=None)) for n in (1, 2)]

    def total(side: int, measure: str, year: str) -> float:
        parts = [
            cell.values.sum()
            for key, cell in sides[side].items()
            if (key.measure, key.period) == (measure, year)
            and key.area in ("north", "south")
            and key.sex in "fm"
        ]
        return float(sum(parts)) if parts else np.nan

    changed = {
        key.period
        for key in sides[0].keys() | sides[1].keys()
        if _numbers(sides[0], key) != _numbers(sides[1], key)
    }
    assert {one.period for one in told.years} == changed
    for one in told.years:
        for measure in ("deaths", "person_years"):
            wanted = [total(side, measure, one.period) for side in (0, 1)]
            np.testing.assert_equal(getattr(one, measure), wanted)
    assert told.gives_way is not None
    held = set(sides[0]) - set(sides[1])
    if not taking.areas and not taking.periods and taking.gives_way != "cells":
        parts = {key for key in held if key.area != "isle"}
        assert told.gives_way[taking.gives_way] >= len(parts)
    assert told.gives_way["cells"] == 0


def _numbers(cells: dict[Key, schedules.Vector], key: Key) -> list[float]:
    return cells[key].values.tolist() if key in cells else []


def test_counts_of_ages_are_told_apart(session: Session) -> None:
    """One number of one age moves: one count of women, one of persons, both in the whole too."""
    content = counts_csv().replace(b"2001,f,0,north,21,", b"2001,f,0,north,22,")
    told = shown(session, checked_upload(session, content, mapping=WHOLE).id)
    assert (told.cells.changed, told.schedules.changed) == (4, 4)
    (year,) = told.years
    assert year.deaths[1] - year.deaths[0] == 1
    assert year.person_years[0] == year.person_years[1]
    assert told.settled == told.unsettled == ()


def test_a_status_alone_is_named_as_such(session: Session) -> None:
    provisional = replace(WHOLE, provisional_years=("2002",))
    told = shown(session, checked_upload(session, counts_csv(), mapping=provisional).id)
    assert (told.settled, told.unsettled) == ((), ("2002",))
    assert (told.schedules.changed, told.schedules.restated) == (0, 18)
    content = counts_csv().replace(b"2002,f,0,north,", b"2002,f,0,north,1")
    moved = shown(session, checked_upload(session, content, mapping=provisional).id)
    assert moved.unsettled == ()


def test_nothing_is_written_and_refusals_are_told(session: Session) -> None:
    upload = checked_upload(session, counts_csv(), mapping=WHOLE)
    refused = shown(session, upload.id, Taking(areas=("east",)))
    assert refused.refusal is not None
    assert "were not handed in" in str(refused.refusal)
    assert len(editions.listing(session, "saltmarsh")) == 1
    other = checked_upload(session, counts_csv(times=2), mapping=WHOLE)
    commit_upload(session, upload_id=other.id, note="n", by=LOCAL, now=NOON)
    assert isinstance(shown(session, upload.id).refusal, Stale)


def test_an_unsound_upload_has_none(session: Session) -> None:
    upload = checked_upload(session, counts_csv().replace(b"21,", b"-21,", 1))
    assert preview_upload(session, upload_id=upload.id, taking=ALL_OF_IT, by=LOCAL) is None
    with pytest.raises(NotAllowed):
        preview_upload(
            session, upload_id=upload.id, taking=ALL_OF_IT, by=Viewer("guest", frozenset())
        )
