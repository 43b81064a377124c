"""Editions: what stands, what is refused, and what one statement tells."""

import re
from collections.abc import Callable
from contextlib import AbstractContextManager
from dataclasses import replace

import numpy as np
import pytest
from sqlalchemy import Engine, text
from sqlalchemy.exc import IntegrityError
from sqlalchemy.orm import Session

from server.store import areas, collections, editions, schedules, uploads
from server.store.connect import transaction
from server.store.errors import Missing, Refused, Stale, Taken
from server.store.heading import heading
from server.store.records import Area, Change, Event, Key
from tests.factories import BASIS, NOON, cells, stored_collection, stored_edition, withdrawn

Counting = Callable[[], AbstractContextManager[list[str]]]


@pytest.fixture(autouse=True)
def collection(session: Session) -> None:
    stored_collection(session)


def test_an_edition_is_read_as_it_was_written(session: Session) -> None:
    made = stored_edition(session, cells("ab"))
    assert editions.find(session, "saltmarsh", 1) == made
    assert (made.number, made.base, made.made, made.basis) == (1, 0, NOON, BASIS)
    loaded = schedules.load(session, "saltmarsh", 1)
    assert list(loaded) == sorted(cells("ab"))
    for key, cell in cells("ab").items():
        assert (loaded[key].status, loaded[key].grid) == (cell.status, cell.grid)
        assert loaded[key].values.tobytes() == cell.values.tobytes()


def test_the_newest_standing_edition_is_the_highest_not_withdrawn(session: Session) -> None:
    assert editions.newest_standing(session, "saltmarsh") is None
    for factor in (1, 2, 3):
        stored_edition(session, cells(times=factor))
    withdrawn(session, 3)
    standing = editions.newest_standing(session, "saltmarsh")
    assert standing is not None
    assert standing.number == 2
    assert [one.number for one in editions.listing(session, "saltmarsh")] == [3, 2, 1]
    with transaction(session):
        again = editions.record_event(
            session, "saltmarsh", 3, "reinstated", by="b", note="right after all", at=NOON
        )
    assert again.events == (
        Event("withdrawn", NOON, "a tester", "wrong"),
        Event("reinstated", NOON, "b", "right after all"),
    )
    assert not again.withdrawn
    assert editions.newest_standing(session, "saltmarsh") == again


def test_an_edition_after_a_withdrawal_is_built_on_what_stands(session: Session) -> None:
    stored_edition(session, cells("a"))
    stored_edition(session, cells("b", times=2))
    withdrawn(session, 2)
    third = stored_edition(session, cells("c"))
    assert third.base == 1
    assert schedules.contents(session, "saltmarsh", 3).areas == ("a", "c")
    assert schedules.contents(session, "saltmarsh", 2).areas == ("a", "b")


def test_the_same_content_has_the_same_digest_however_it_came_about(session: Session) -> None:
    together = stored_edition(session, cells("ab"))
    stored_edition(session, cells("ab", times=5))
    parts = {key: cell for key, cell in cells("ab").items() if key.area == "b"}
    rest = {key: cell for key, cell in cells("ab").items() if key.area == "a"}
    stored_edition(session, parts)
    again = stored_edition(session, rest)
    assert again.digest == together.digest
    assert again.number == 4


def test_an_unchanged_schedule_is_stored_once(session: Session, engine: Engine) -> None:
    stored_edition(session, cells("ab"))
    stored_edition(session, cells("ab"))
    stored_edition(session, {**cells("ab"), **cells("b", sexes="p")})
    with engine.connect() as connection:
        count = connection.execute(text("SELECT count(*) FROM schedule")).scalar_one()
    assert count == 8 + 2


def test_a_commit_against_another_base_is_refused(session: Session) -> None:
    stored_edition(session, cells("a"))
    stored_edition(session, cells("b"))
    with (
        pytest.raises(Stale, match="against edition 1, but edition 2 stands now"),
        transaction(session),
    ):
        editions.require_base(session, "saltmarsh", 1)
    withdrawn(session, 2)
    with transaction(session):
        editions.require_base(session, "saltmarsh", 1)
    with (
        pytest.raises(Stale, match="against no edition, but edition 1 stands now"),
        transaction(session),
    ):
        editions.require_base(session, "saltmarsh", 0)


def test_an_edition_made_and_withdrawn_meanwhile_does_not_spoil_the_ranges(
    session: Session,
) -> None:
    stored_edition(session, cells("a"))
    areas_of = (Area("a", ""),)
    change = Change("saltmarsh", 1, cells("a", times=3), areas_of, BASIS)
    prepared = editions.prepare(session, change)
    stored_edition(session, cells("a", times=2))
    withdrawn(session, 2)
    with transaction(session):
        editions.require_base(session, "saltmarsh", 1)
        third = editions.write(session, prepared, by="me", note="", at=NOON)
    key = Key("a", "f", "2001", "deaths")
    seen = [schedules.load(session, "saltmarsh", n)[key].values[0] for n in (1, 2, 3)]
    assert seen == [101.0, 202.0, 303.0]
    assert (third.number, third.base) == (3, 1)


def test_a_replacing_edition_holds_nothing_of_its_base(session: Session) -> None:
    stored_edition(session, cells("ab"), areas=[Area("a", ""), Area("b", "")])
    second = stored_edition(session, cells("c"), replace=True)
    assert second.replaces
    assert schedules.contents(session, "saltmarsh", 2).areas == ("c",)
    assert [area.code for area in areas.listing(session, "saltmarsh", 2)] == ["c"]
    assert [area.code for area in areas.listing(session, "saltmarsh", 1)] == ["a", "b"]


def test_the_basis_is_that_of_its_edition(session: Session) -> None:
    stored_edition(session, cells())
    stored_edition(session, cells(), basis=replace(BASIS, dated_by="registration"))
    first, second = (editions.find(session, "saltmarsh", number) for number in (1, 2))
    assert first is not None
    assert second is not None
    assert (first.basis.dated_by, second.basis.dated_by) == ("death", "registration")
    assert first.digest != second.digest


@pytest.mark.parametrize(
    ("number", "what", "message"),
    [
        (1, "reinstated", "Edition 1 was not withdrawn; it stands"),
        (2, "withdrawn", "Edition 2 is withdrawn already"),
        (7, "withdrawn", "There is no edition 7; known: 2, 1"),
    ],
)
def test_an_event_that_changes_nothing_is_refused(
    session: Session, number: int, what: str, message: str
) -> None:
    stored_edition(session, cells())
    stored_edition(session, cells())
    withdrawn(session, 2)
    before = collections.find(session, "saltmarsh").revision
    with pytest.raises(Refused, match=message), transaction(session):
        editions.record_event(session, "saltmarsh", number, what, by="", note="", at=NOON)  # type: ignore[arg-type]
    assert collections.find(session, "saltmarsh").revision == before


def test_the_revision_counts_editions_and_events(session: Session) -> None:
    seen = [collections.find(session, "saltmarsh").revision]
    stored_edition(session, cells())
    seen.append(collections.find(session, "saltmarsh").revision)
    withdrawn(session, 1)
    seen.append(collections.find(session, "saltmarsh").revision)
    assert seen == [0, 1, 2]


def test_no_row_of_an_edition_is_ever_changed(session: Session, count_statements: Counting) -> None:
    with count_statements() as statements:
        for factor in (1, 2):
            stored_edition(session, cells(times=factor))
        withdrawn(session, 2)
        stored_edition(session, cells(times=3))
    assert any(one.startswith("INSERT INTO edition ") for one in statements)
    assert [one for one in statements if re.match("(UPDATE|DELETE FROM) edition ", one)] == []


def test_a_heading_is_one_statement(session: Session, count_statements: Counting) -> None:
    for factor in (1, 2, 3):
        stored_edition(session, cells(times=factor))
    withdrawn(session, 3)
    session.rollback()
    with count_statements() as statements:
        shown = heading(session, "saltmarsh", 3)
    assert len(statements) == 1
    assert shown.collection == collections.find(session, "saltmarsh")
    assert shown.edition == editions.find(session, "saltmarsh", 3)
    assert shown.edition.withdrawn
    assert shown.newest == 2
    for number in (1, 2):
        withdrawn(session, number)
    assert heading(session, "saltmarsh", 1).newest is None


def test_what_is_not_there_is_named_with_what_is(session: Session) -> None:
    with pytest.raises(Missing, match="There is no collection reef; known: saltmarsh"):
        heading(session, "reef", 1)
    with pytest.raises(Missing, match="There is no edition 1, nor any other yet"):
        heading(session, "saltmarsh", 1)
    stored_edition(session, cells())
    with pytest.raises(Missing, match="There is no edition 2; known: 1"):
        heading(session, "saltmarsh", 2)
    with pytest.raises(Taken, match="There is a collection saltmarsh already"):
        stored_collection(session)


@pytest.mark.parametrize("number", [0, -1, 2**31, 2**70])
def test_a_number_that_no_edition_can_have_is_missing(session: Session, number: int) -> None:
    stored_edition(session, cells())
    with pytest.raises(Missing, match=f"There is no edition {number}; known: 1"):
        heading(session, "saltmarsh", number)
    assert editions.find(session, "saltmarsh", number) is None
    with pytest.raises(Missing, match=rf"There is no upload {number}\.$"):
        uploads.find(session, number)


def test_a_code_that_no_collection_can_have_is_missing(session: Session) -> None:
    for code in ("salt\0marsh", "\0", "é" * 400, ""):
        with pytest.raises(Missing, match="known: saltmarsh"):
            heading(session, code, 1)
        with pytest.raises(Missing, match="known: saltmarsh"):
            collections.find(session, code)


def test_collections_do_not_see_each_other(session: Session) -> None:
    stored_collection(session, "reef")
    stored_edition(session, cells("a"))
    stored_edition(session, cells("b"), collection="reef")
    assert schedules.contents(session, "saltmarsh", 1).areas == ("a",)
    assert schedules.contents(session, "reef", 1).areas == ("b",)
    assert [one.code for one in collections.all_collections(session)] == ["reef", "saltmarsh"]


def test_the_database_itself_refuses_two_open_rows_of_a_key(
    session: Session, engine: Engine
) -> None:
    stored_edition(session, cells())
    copy = (
        "INSERT INTO schedule (collection_id, area, sex, period, period_start, measure, cause,"
        " status, grid_id, vector, digest, first) SELECT collection_id, area, sex, period,"
        " period_start, measure, cause, status, grid_id, vector, digest, 2 FROM schedule"
    )
    with pytest.raises(IntegrityError), engine.begin() as connection:
        connection.execute(text(copy))


def test_numbers_come_back_to_the_last_bit(session: Session) -> None:
    key, cell = next(iter(cells(sexes="f", measures=("deaths",)).items()))
    values = np.array([0.1 + 0.2, np.nan, -0.0, 123456789.123456])
    stored_edition(session, {key: replace(cell, values=values)})
    read = schedules.load(session, "saltmarsh", 1)[key].values
    assert read.tobytes() == np.array([0.3, np.nan, 0.0, 123456789.123456]).tobytes()
