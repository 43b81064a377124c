"""Engines, sessions and the one way to write: `transaction`."""

import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from sqlalchemy import URL, Connection, Engine, NullPool, create_engine, event, make_url
from sqlalchemy.exc import ArgumentError
from sqlalchemy.orm import Session, sessionmaker

from server.store.errors import Unreachable

__all__ = ["Engine", "Session", "make_engine", "sessions", "transaction"]


def make_engine(url: str, *, migrating: bool = False) -> Engine:
    """An engine for SQLite or PostgreSQL. `migrating` keeps no connection for later, and leaves
    SQLite's foreign keys unenforced, since changing a table there means making it anew.

    Raises: Unreachable where the address cannot be read, or its folder or driver is not to be had.
    """
    if url.startswith("postgresql:"):
        url = url.replace("postgresql:", "postgresql+psycopg:", 1)
    try:
        address = make_url(url)
    except ArgumentError as error:  # the address may hold a password: it is not shown
        raise Unreachable("EBBLINE_DATABASE_URL", "it is no address of a database") from error
    try:
        return _engine(address, NullPool if migrating else None, migrating=migrating)
    except (OSError, ArgumentError, ModuleNotFoundError) as error:
        raise Unreachable(str(address), error) from error


def _engine(address: URL, pool: type[NullPool] | None, *, migrating: bool) -> Engine:
    if address.get_backend_name() != "sqlite":
        return create_engine(address, poolclass=pool, pool_pre_ping=True)
    if address.database:
        Path(address.database).parent.mkdir(parents=True, exist_ok=True)
    engine = create_engine(address, poolclass=pool)
    _prepare_sqlite(engine, foreign_keys=not migrating)
    return engine


def sessions(engine: Engine) -> sessionmaker[Session]:
    return sessionmaker(engine, expire_on_commit=False)


@contextmanager
def transaction(session: Session) -> Iterator[None]:
    """Write inside it: committed at its end, rolled back on an exception.

    What the session has read so far is let go first: a reading transaction of SQLite that turns
    to writing may fail at once, whatever the timeout; this one takes the write lock as it begins.
    """
    session.rollback()
    session.connection(execution_options={"sqlite_begin": "IMMEDIATE"})
    try:
        yield
    except BaseException:
        session.rollback()
        raise
    session.commit()


def scrub(session: Session, *, erased: bool = False) -> bool:
    """After rows were deleted, or with `erased` personal data emptied on purpose, see to what the
    database's own files still hold of them, outside a transaction; whether nothing is left there.

    On SQLite what is freed is overwritten as it is freed (`secure_delete`), and the log of writes
    is taken over and emptied, which a reader at work may hold up. On PostgreSQL rows that were
    deleted stay in the files of the table until it is vacuumed and their place is used again, and
    in the log of writes until its segments are reused; nobody reads them through the database.
    With `erased` the table of files is written anew (`VACUUM FULL`: every other use of it waits
    until what is left is written), so that they remain in that log alone. Backups, archived logs
    and what a disk keeps of overwritten places are out of reach on both."""
    session.rollback()
    engine = session.get_bind()
    assert isinstance(engine, Engine)
    if engine.dialect.name != "sqlite":
        if erased:
            with engine.connect().execution_options(isolation_level="AUTOCOMMIT") as connection:
                connection.exec_driver_sql("VACUUM FULL upload_file")
        return erased
    bare = (
        engine.raw_connection()
    )  # SQLAlchemy would begin a transaction, in which none can be done
    try:
        held_up, *_ = bare.cursor().execute("PRAGMA wal_checkpoint(TRUNCATE)").fetchone()
    finally:
        bare.close()
    return not held_up


def _prepare_sqlite(engine: Engine, *, foreign_keys: bool) -> None:
    @event.listens_for(engine, "connect")
    def on_connect(connection: sqlite3.Connection, _record: object) -> None:
        connection.isolation_level = None  # sqlite3 must not begin transactions itself
        for pragma in (
            "journal_mode=WAL",
            "synchronous=FULL",  # NORMAL may lose the last commit when the power goes
            "busy_timeout=30000",
            "journal_size_limit=67108864",
            "secure_delete=ON",  # what is deleted, or erased on demand, is overwritten
            f"foreign_keys={'ON' if foreign_keys else 'OFF'}",
        ):
            connection.execute(f"PRAGMA {pragma}")

    @event.listens_for(engine, "begin")
    def on_begin(connection: Connection) -> None:
        mode = connection.get_execution_options().get("sqlite_begin", "DEFERRED")
        connection.exec_driver_sql(f"BEGIN {mode}")
