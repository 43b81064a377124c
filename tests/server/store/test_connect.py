"""Sessions and transactions on both databases; what SQLite is asked for."""

from threading import Barrier, Thread

import pytest
from sqlalchemy import Engine, text
from sqlalchemy.orm import Session, sessionmaker

from server.store import collections
from server.store.connect import make_engine, transaction
from tests.factories import stored_collection


def test_sqlite_is_durable_and_keeps_its_references(sqlite_url: str) -> None:
    engine = make_engine(sqlite_url)
    with engine.connect() as connection:
        found = {
            name: connection.execute(text(f"PRAGMA {name}")).scalar_one()
            for name in ("journal_mode", "synchronous", "busy_timeout", "foreign_keys")
        }
    engine.dispose()
    assert found == {
        "journal_mode": "wal",
        "synchronous": 2,  # FULL
        "busy_timeout": 30000,
        "foreign_keys": 1,
    }


def test_what_is_written_inside_a_transaction_is_seen_after_it(
    session: Session, new_session: sessionmaker[Session]
) -> None:
    stored_collection(session)
    with new_session() as other:
        assert collections.find(other, "saltmarsh").owner == "office"


def test_an_exception_takes_everything_back(
    session: Session, new_session: sessionmaker[Session]
) -> None:
    def interrupted() -> None:
        with transaction(session):
            stored = collections.find(session, "saltmarsh")
            collections.touch(session, stored.id)
            raise KeyboardInterrupt

    stored_collection(session)
    with pytest.raises(KeyboardInterrupt):
        interrupted()
    with new_session() as other:
        assert collections.find(other, "saltmarsh").revision == 0
    assert collections.find(session, "saltmarsh").revision == 0


def test_sessions_that_read_before_they_write_wait_for_each_other(
    session: Session, new_session: sessionmaker[Session]
) -> None:
    """Before the transaction and in it. A reading transaction that turned to writing would fail at
    once on SQLite."""
    stored = stored_collection(session)
    start, failures = Barrier(4), []

    def work() -> None:
        try:
            with new_session() as own:
                start.wait()
                for _ in range(10):
                    collections.find(own, "saltmarsh")
                    with transaction(own):
                        collections.find(own, "saltmarsh")
                        collections.touch(own, stored.id)
        except Exception as error:
            failures.append(error)

    threads = [Thread(target=work) for _ in range(4)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert failures == []
    assert collections.find(session, "saltmarsh").revision == 40


def test_a_reader_sees_one_state_while_another_writes(
    session: Session, new_session: sessionmaker[Session], engine: Engine
) -> None:
    stored = stored_collection(session)
    with new_session() as reader, transaction(session):
        collections.touch(session, stored.id)
        assert collections.find(reader, "saltmarsh").revision == 0


def test_the_folder_of_a_new_sqlite_file_is_made(tmp_path: object) -> None:
    engine = make_engine(f"sqlite:///{tmp_path}/deep/inside/ebbline.db")
    with engine.connect() as connection:
        assert connection.execute(text("SELECT 1")).scalar_one() == 1
    engine.dispose()


def test_a_plain_postgresql_address_takes_the_driver_we_have() -> None:
    engine = make_engine("postgresql://app@127.0.0.1:1/x")
    assert engine.url.drivername == "postgresql+psycopg"
    engine.dispose()
