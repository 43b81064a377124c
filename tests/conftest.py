"""Databases for the tests: each test gets a fresh one, on SQLite and on PostgreSQL."""

import datetime as dt
import os
import shutil
from collections.abc import Callable, Iterator
from contextlib import AbstractContextManager, contextmanager
from pathlib import Path

import pytest
from hypothesis import settings as hypothesis_settings
from sqlalchemy import Engine, event
from sqlalchemy.orm import Session, sessionmaker

from seed_scenarios import quillmere, quillmere_causes
from server.config import Config
from server.store.connect import make_engine, sessions
from server.store.migrating import migrate
from tests import postgres
from tests.once import once

# no example is failed for its time: a machine with other work on it is slow, not wrong
hypothesis_settings.register_profile("patient", deadline=None)
hypothesis_settings.load_profile("patient")

DATABASE = "ebbline.db"  # in a data folder
DEMONSTRATED = dt.datetime(2026, 12, 1, 9, tzinfo=dt.UTC)
POSTGRESQL = pytest.param("postgresql", marks=pytest.mark.postgres)
# where the database itself can matter: its SQL, its locks, what it keeps; everything else reads
# and writes through these
ON_BOTH = (
    "tests/server/actions/",
    "tests/server/jobs/",
    "tests/server/store/",
    "tests/server/results/test_loading.py",
    "tests/server/results/test_changes.py",
    "tests/server/results/test_provisional.py",
)

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
    "tests/server/pages/test_what_if.py",
    "tests/server/results/test_breaks.py",
    "tests/server/results/test_comparison.py",
    "tests/server/results/test_what_if.py",
    "tests/server/routes/test_addresses.py",
    "tests/server/routes/test_comparison.py",
    "tests/server/routes/test_curves.py",
    "tests/server/routes/test_population_year.py",
    "tests/server/routes/test_statements.py",
    "tests/server/routes/test_strange_names.py",
    "tests/server/routes/test_uploads.py",
    "tests/server/routes/test_what_would_change.py",
    "tests/server/store/test_histories.py",
    "tests/server/web/test_guard.py",
}


def pytest_generate_tests(metafunc: pytest.Metafunc) -> None:
    """A test that names no database itself gets SQLite, or both where that can matter."""
    named = {str(one.args[0]) for one in metafunc.definition.iter_markers("parametrize")}
    here = metafunc.definition.path.relative_to(metafunc.config.rootpath).as_posix()
    for name in {"db_url", "empty_url"}.intersection(metafunc.fixturenames) - named:
        given = ["sqlite", POSTGRESQL] if here.startswith(ON_BOTH) else ["sqlite"]
        metafunc.parametrize(name, given, indirect=True)


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
def shared(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The folder of this run, the same one for every worker."""
    mine = tmp_path_factory.getbasetemp()
    return mine.parent if "PYTEST_XDIST_WORKER" in os.environ else mine


@pytest.fixture(scope="session")
def sqlite_template(shared: Path) -> Path:
    return once(shared, "migrated", lambda folder: migrate(Config(data=folder).url)) / DATABASE


@pytest.fixture(scope="session")
def delivered(shared: Path, sqlite_template: Path) -> Path:
    """A data folder with the first two editions of the demonstration; to be copied, not changed."""

    def fill(folder: Path) -> None:
        shutil.copy(sqlite_template, folder / DATABASE)
        with opened(folder) as session:
            quillmere.deliver(session, now=DEMONSTRATED)

    return once(shared, "delivered", fill)


@pytest.fixture(scope="session")
def demonstration(shared: Path, delivered: Path) -> Path:
    """A data folder with the whole demonstration; to be copied, not changed."""

    def fill(folder: Path) -> None:
        shutil.copytree(delivered, folder, dirs_exist_ok=True)
        with opened(folder) as session:
            quillmere.recount(session, now=DEMONSTRATED)
            quillmere.protect(session, now=DEMONSTRATED)
            quillmere_causes.build(session, now=DEMONSTRATED)

    return once(shared, "demonstration", fill)


@contextmanager
def opened(folder: Path) -> Iterator[Session]:
    """A session on the database of a data folder."""
    engine = make_engine(Config(data=folder).url)
    with sessions(engine)() as session:
        yield session
    engine.dispose()


@pytest.fixture(scope="module")
def lasting(sqlite_template: Path, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Session]:
    """A session on a SQLite database of all tests of one file, for those that only read from it
    what one fixture wrote."""
    folder = tmp_path_factory.mktemp("lasting")
    shutil.copy(sqlite_template, folder / DATABASE)
    with opened(folder) as session:
        yield session


@pytest.fixture
def empty_url(request: pytest.FixtureRequest) -> Iterator[str]:
    """A database without tables."""
    if request.param == "sqlite":
        yield f"sqlite:///{request.getfixturevalue('tmp_path') / 'empty.db'}"
    else:
        with postgres.created(request.getfixturevalue("postgres_server"), "empty") as address:
            yield address


@pytest.fixture
def db_url(request: pytest.FixtureRequest) -> Iterator[str]:
    """A migrated, empty database."""
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
