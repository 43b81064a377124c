"""Databases for the tests: each test gets a fresh one, on SQLite and on PostgreSQL."""

import shutil
from collections.abc import Callable, Iterator
from contextlib import AbstractContextManager, contextmanager
from pathlib import Path

import pytest
from hypothesis import settings as hypothesis_settings
from sqlalchemy import Engine, event
from sqlalchemy.orm import Session, sessionmaker

from server.store.connect import make_engine, sessions
from server.store.migrating import migrate
from tests import postgres

# no example is failed for its time: a machine with other work on it is slow, not wrong
hypothesis_settings.register_profile("patient", deadline=None)
hypothesis_settings.load_profile("patient")

BOTH = ["sqlite", pytest.param("postgresql", marks=pytest.mark.postgres)]

# files of tests that take seconds together, by measure: the working loop leaves them out
SLOW = {
    "tests/house/test_pages.py",
    "tests/house/test_readme.py",
    "tests/server/actions/test_rebuild_editions.py",
    "tests/server/cli/test_editions.py",
    "tests/server/cli/test_figure.py",
    "tests/server/intake/test_fuzz.py",
    "tests/server/pages/test_breaks.py",
    "tests/server/pages/test_comparison.py",
    "tests/server/pages/test_comparison_contributions.py",
    "tests/server/pages/test_curves.py",
    "tests/server/pages/test_population_year.py",
    "tests/server/pages/test_population_year_models.py",
    "tests/server/results/test_breaks.py",
    "tests/server/results/test_comparison.py",
    "tests/server/routes/test_addresses.py",
    "tests/server/routes/test_comparison.py",
    "tests/server/routes/test_curves.py",
    "tests/server/routes/test_population_year.py",
    "tests/server/routes/test_statements.py",
    "tests/server/routes/test_strange_names.py",
    "tests/server/routes/test_uploads.py",
    "tests/server/store/test_histories.py",
    "tests/server/web/test_guard.py",
}


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    """The working loop is everything that is not marked as something slower.

    Called after the hooks of inner conftests, which mark, and before pytest selects by marks; a
    `tryfirst` or `trylast` would break the one or the other.
    """
    for item in items:
        if item.path.relative_to(item.config.rootpath).as_posix() in SLOW:
            item.add_marker("slow")
        if not any(item.get_closest_marker(name) for name in ("slow", "browser", "postgres")):
            item.add_marker("fast")


@pytest.fixture(scope="session")
def postgres_server() -> Iterator[str]:
    """One server for the run (for each worker, where there are several)."""
    with postgres.server() as address:
        yield address


@pytest.fixture(scope="session")
def postgres_one(postgres_server: str) -> Iterator[postgres.Reused]:
    """The migrated database that one test after the other finds empty."""
    with postgres.created(postgres_server, "ebbline") as address:
        migrate(address)
        yield postgres.Reused(address)


@pytest.fixture(scope="session")
def sqlite_template(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("template") / "ebbline.db"
    migrate(f"sqlite:///{path}")
    return path


@pytest.fixture(params=BOTH)
def empty_url(request: pytest.FixtureRequest) -> Iterator[str]:
    """A database without tables, on either."""
    if request.param == "sqlite":
        yield f"sqlite:///{request.getfixturevalue('tmp_path') / 'empty.db'}"
    else:
        with postgres.created(request.getfixturevalue("postgres_server"), "empty") as address:
            yield address


@pytest.fixture(params=BOTH)
def db_url(request: pytest.FixtureRequest) -> Iterator[str]:
    """A migrated, empty database, on either."""
    if request.param == "sqlite":
        yield request.getfixturevalue("sqlite_url")
    else:
        one: postgres.Reused = request.getfixturevalue("postgres_one")
        yield one.address
        one.empty()


@pytest.fixture
def sqlite_url(sqlite_template: Path, tmp_path: Path) -> str:
    """A migrated, empty SQLite file, for tests of what does not depend on the database."""
    return f"sqlite:///{shutil.copy(sqlite_template, tmp_path / 'ebbline.db')}"


@pytest.fixture
def engine(db_url: str) -> Iterator[Engine]:
    made = make_engine(db_url)
    yield made
    made.dispose()


@pytest.fixture
def new_session(engine: Engine) -> sessionmaker[Session]:
    """Makes further sessions on the test's database, as other requests would."""
    return sessions(engine)


@pytest.fixture
def session(new_session: sessionmaker[Session]) -> Iterator[Session]:
    with new_session() as opened:
        yield opened


@pytest.fixture
def count_statements() -> Callable[[], AbstractContextManager[list[str]]]:
    """`with count_statements() as statements:` collects what is sent to any database inside it,
    without the beginning of transactions."""

    @contextmanager
    def counting() -> Iterator[list[str]]:
        statements: list[str] = []

        def note(_c: object, _cursor: object, statement: str, *_rest: object) -> None:
            if not statement.startswith("BEGIN"):
                statements.append(statement)

        event.listen(Engine, "before_cursor_execute", note)
        try:
            yield statements
        finally:
            event.remove(Engine, "before_cursor_execute", note)

    return counting
