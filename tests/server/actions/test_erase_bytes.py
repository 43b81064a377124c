"""Bytes erased on demand are gone from the database's files; digests, report and editions stay."""

from dataclasses import replace
from pathlib import Path

import pytest
from sqlalchemy import Engine, event, text
from sqlalchemy.orm import Session, sessionmaker

from server.accounts.viewer import LOCAL, NotAllowed, Right, Viewer
from server.actions.commit_upload import commit_upload
from server.actions.correct_upload import correct_upload
from server.actions.discard_upload import discard_upload
from server.actions.erase_bytes import Erased, erase_bytes
from server.actions.rebuild_editions import rebuild_editions
from server.store import collections, editions, uploads
from server.store.errors import Refused
from server.store.records import ALL_OF_IT, Taking
from tests.factories import COLUMNS, NOON, checked_upload, counts_csv, stored_collection

NAME = b"Ermintrude Quillfeather"
WHOLE = replace(COLUMNS, whole="isle")


def personal() -> bytes:
    """Counts with a column of names that nobody asked for, long enough to fill pages of its own."""
    head, *rows = counts_csv().splitlines()
    named = [row + b"," + NAME + b"%04d" % at for at, row in enumerate(rows)]
    return b"\n".join([head + b",who", *named]) + b"\n" * 20_000


@pytest.fixture(autouse=True)
def committed(session: Session) -> None:
    stored_collection(session)
    for content, taking in (
        (personal(), ALL_OF_IT),
        (counts_csv(["north"], times=2), ALL_OF_IT),
        (counts_csv(["north"], times=3), Taking(gives_way="all")),
    ):
        upload = checked_upload(session, content, mapping=WHOLE)
        commit_upload(session, upload_id=upload.id, note="n", by=LOCAL, now=NOON, taking=taking)


def erase(session: Session, upload: int = 1, why: str = " Names were sent. ") -> Erased:
    return erase_bytes(session, upload_id=upload, why=why, by=LOCAL, now=NOON)


def kept(engine: Engine) -> list[str]:
    """Of SQLite's own files those that still hold the name."""
    path = Path(engine.url.database or "")
    return [one.name for one in path.parent.glob(f"{path.name}*") if NAME in one.read_bytes()]


def test_the_bytes_are_gone_and_the_rest_stays(session: Session, engine: Engine) -> None:
    before = uploads.find(session, 1)
    edition, revision = editions.find(session, "saltmarsh", 1), _revision(session)
    if engine.dialect.name == "sqlite":
        assert kept(engine) != []
    done = erase(session)
    assert done.gone
    (file,) = done.upload.files
    assert (file.erased, file.erased_by, file.erased_why) == (NOON, LOCAL.name, "Names were sent.")
    (old,) = before.files
    assert (file.sha256, file.size, file.mapping) == (old.sha256, old.size, old.mapping)
    assert (done.upload.report, done.upload.edition) == (before.report, 1)
    assert uploads.file_bytes(session, 1, "counts") == b""
    assert editions.find(session, "saltmarsh", 1) == edition
    assert _revision(session) == revision + 1  # pages are sent anew
    assert uploads.erasures(session, "saltmarsh") == {1: (file,)}
    if engine.dialect.name == "sqlite":
        assert kept(engine) == []


def _revision(session: Session) -> int:
    return collections.find(session, "saltmarsh").revision


@pytest.mark.parametrize("db_url", ["sqlite"], indirect=True)  # PostgreSQL waits for its readers
def test_a_reader_at_work_is_told_of(
    session: Session, engine: Engine, new_session: sessionmaker[Session]
) -> None:
    """What somebody still reads stays in the log of writes; done again afterwards, it is gone."""
    with engine.connect() as at_work:
        at_work.execute(text("SELECT count(*) FROM upload_file")).scalar()
        with new_session() as other:
            other.execute(text("PRAGMA busy_timeout=50"))
            assert not erase(other).gone
            other.execute(text("PRAGMA busy_timeout=50"))
    assert erase(session).gone
    assert kept(engine) == []


@pytest.mark.parametrize("way", ["discarded", "corrected"])
def test_a_draft_thrown_away_leaves_nothing_behind(
    session: Session, engine: Engine, way: str
) -> None:
    upload = checked_upload(session, personal().replace(NAME, b"Ermintrude Overwater"))
    if way == "discarded":
        discard_upload(session, upload_id=upload.id, by=LOCAL)
    else:
        file = ("counts", "counts.csv", counts_csv())
        correct_upload(session, upload_id=upload.id, file=file, by=LOCAL, now=NOON)
    if engine.dialect.name == "sqlite":
        path = Path(engine.url.database or "")
        found = list(path.parent.glob(f"{path.name}*"))
        assert not any(b"Ermintrude Overwater" in one.read_bytes() for one in found)


@pytest.mark.parametrize(
    ("way", "anew"),
    [("discarded", False), ("personal", True), ("corrected", False), ("erased", True)],
)
def test_tables_are_written_anew_only_where_personal_data_go(
    session: Session, engine: Engine, way: str, anew: bool
) -> None:
    """On PostgreSQL that keeps all others from the files meanwhile; SQLite never does."""
    upload = checked_upload(session, counts_csv())
    said: list[str] = []
    event.listen(
        engine, "before_cursor_execute", lambda _conn, _cursor, text, *_rest: said.append(text)
    )
    if way == "corrected":
        file = ("counts", "counts.csv", counts_csv())
        correct_upload(session, upload_id=upload.id, file=file, by=LOCAL, now=NOON)
    elif way == "erased":
        erase(session)
    else:
        discard_upload(session, upload_id=upload.id, by=LOCAL, personal=way == "personal")
    anew &= engine.dialect.name == "postgresql"
    assert [one for one in said if "VACUUM" in one] == ["VACUUM FULL upload_file"] * anew


def test_rebuild_says_what_it_cannot_make_and_what_rests_on_it(session: Session) -> None:
    erase(session)
    first, second, third = rebuild_editions(session, collection="saltmarsh", by=LOCAL)
    assert (first.same, first.erased, first.sound, first.reread) == (False, True, True, "")
    assert first.reason.format(**first.values) == (
        "The bytes of counts.csv were erased on 2026-12-01 by local analyst: Names were sent."
    )
    assert (second.same, second.upon) == (True, 1)  # upon edition 1 as it is stored
    assert (third.same, third.upon) == (True, 0)  # it replaced everything


def test_storage_that_no_longer_matches_is_no_stand_in(session: Session, engine: Engine) -> None:
    erase(session)
    session.rollback()  # what it reads next is what stands then
    with engine.begin() as connection:
        connection.execute(
            text("UPDATE schedule SET vector = :zeros WHERE id = (SELECT min(id) FROM schedule)"),
            {"zeros": bytes(32)},
        )
    first, second, _ = rebuild_editions(session, collection="saltmarsh", by=LOCAL)
    assert (first.erased, first.sound) == (True, False)
    assert second.reason.format(**second.values) == "Its base, edition 1, could not be made anew."


def test_what_is_refused(session: Session) -> None:
    analyst = Viewer("analyst", frozenset(Right) - {Right.ADMINISTER})
    with pytest.raises(NotAllowed):
        erase_bytes(session, upload_id=1, why="names", by=analyst, now=NOON)
    with pytest.raises(Refused, match="cannot be erased without a reason"):
        erase(session, why=" ")
    draft = checked_upload(session, counts_csv())
    with pytest.raises(Refused, match=r"Upload 4 is a draft\. Discard it, and say"):
        erase(session, draft.id)
