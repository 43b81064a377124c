"""Runs the migrations; Alembic calls this file. The address comes from the program or from the
environment (EBBLINE_DATABASE_URL, or the SQLite file in EBBLINE_DATA)."""

from alembic import context

from server.config import Config
from server.store.base import Base
from server.store.connect import make_engine
from server.store.tables import Edition  # noqa: F401  the tables enter the metadata


def run(url: str) -> None:
    with make_engine(url, migrating=True).connect() as connection:
        on_sqlite = connection.dialect.name == "sqlite"
        if on_sqlite:  # one migration at a time; the second waits and finds nothing to do
            connection = connection.execution_options(sqlite_begin="IMMEDIATE")
        context.configure(
            connection=connection,
            target_metadata=Base.metadata,
            render_as_batch=on_sqlite,
            transactional_ddl=True,  # SQLite has it too, once its driver begins nothing itself
            compare_type=True,
        )
        with context.begin_transaction():
            context.run_migrations()
            if on_sqlite:
                broken = connection.exec_driver_sql("PRAGMA foreign_key_check").fetchall()
                if broken:
                    raise RuntimeError(f"the migration broke foreign keys: {broken[:5]}")


if context.is_offline_mode():
    raise SystemExit("migrations run against a database only; leave out --sql")
run(context.config.attributes.get("url") or Config.from_environment().url)
