"""What is said before an edition is made is what the edition then does."""

from dataclasses import replace

import numpy as np
import pytest
from sqlalchemy.orm import Session

from server.accounts.viewer import LOCAL, NotAllowed, Viewer
from server.actions.check_upload import check_upload
from server.actions.commit_upload import commit_upload
from server.actions.map_upload import map_upload
from server.actions.preview_upload import foresee_upload, preview_upload
from server.results.preview import Preview
from server.store import editions, foreseen, schedules
from server.store.errors import Refused, Stale
from server.store.records import ALL_OF_IT, GIVES_WAY, Key, Selection, Taking
from tests.factories import BASIS, COLUMNS, NOON, checked_upload, counts_csv, stored_collection

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
    """What all of it would change is known since the checks; other choices are worked out."""
    if taking != ALL_OF_IT:
        assert preview_upload(session, upload_id=upload, taking=taking, by=LOCAL) is None
        foresee_upload(session, upload_id=upload, taking=taking, by=LOCAL)
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


def test_it_is_told_without_the_files_being_read(
    session: Session, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A look at the page costs what it costs to read what was worked out; the same numbers as
    when it is worked out anew."""
    upload = checked_upload(session, counts_csv(times=2), mapping=WHOLE)
    known = shown(session, upload.id)
    foresee_upload(session, upload_id=upload.id, taking=ALL_OF_IT, by=LOCAL)
    assert shown(session, upload.id) == known
    one = Taking(areas=("north",), periods=("2002", "2001"), gives_way="areas")
    other = shown(session, upload.id, one)

    def unread(*_args: object, **_named: object) -> bytes:
        raise AssertionError("the files were read")

    monkeypatch.setattr("server.store.uploads.file_bytes", unread)
    assert preview_upload(session, upload_id=upload.id, taking=ALL_OF_IT, by=LOCAL) == known
    assert preview_upload(session, upload_id=upload.id, taking=one, by=LOCAL) == other
    assert other.cells != known.cells


def test_what_was_worked_out_falls_with_the_mapping_and_the_checks(session: Session) -> None:
    upload = checked_upload(session, counts_csv(times=2), mapping=WHOLE)
    one = Taking(periods=("2001",))
    shown(session, upload.id, one)
    check_upload(session, upload_id=upload.id)
    assert preview_upload(session, upload_id=upload.id, taking=one, by=LOCAL) is None
    assert shown(session, upload.id).schedules.changed
    map_upload(
        session, upload_id=upload.id, mappings={"counts": WHOLE}, basis=BASIS, by=LOCAL, now=NOON
    )
    assert foreseen.find(session, upload.id, taking="", base=1) is None
    with pytest.raises(Refused, match="has not been checked"):
        foresee_upload(session, upload_id=upload.id, taking=one, by=LOCAL)
    assert preview_upload(session, upload_id=upload.id, taking=ALL_OF_IT, by=LOCAL) is None


def test_nothing_is_worked_out_beside_another_base(session: Session) -> None:
    upload = checked_upload(session, counts_csv(times=3), mapping=WHOLE)
    other = checked_upload(session, counts_csv(times=2), mapping=WHOLE)
    commit_upload(session, upload_id=other.id, note="n", by=LOCAL, now=NOON)
    with pytest.raises(Stale, match="edition 2 stands now"):
        foresee_upload(session, upload_id=upload.id, taking=Taking(periods=("2001",)), by=LOCAL)


def test_an_unsound_upload_has_none(session: Session) -> None:
    upload = checked_upload(session, counts_csv().replace(b"21,", b"-21,", 1))
    assert preview_upload(session, upload_id=upload.id, taking=ALL_OF_IT, by=LOCAL) is None
    with pytest.raises(NotAllowed):
        preview_upload(
            session, upload_id=upload.id, taking=ALL_OF_IT, by=Viewer("guest", frozenset())
        )
