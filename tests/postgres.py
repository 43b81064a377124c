"""A throw-away PostgreSQL on loopback for the tests that need a real one."""

import os
import shutil
import socket
import subprocess
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any, NoReturn

import pytest
from sqlalchemy import NullPool, create_engine, inspect, text

OPTIONS = "-c fsync=off -c full_page_writes=off -c synchronous_commit=off -c max_connections=30"


def missing(what: str) -> NoReturn:
    """Skip for want of a real program, or fail where the run must not pass without it."""
    if os.environ.get("EBBLINE_REQUIRE_REAL") == "1":
        pytest.fail(what)
    pytest.skip(what)


@contextmanager
def server() -> Iterator[str]:
    """Start one; gives the address up to the database's name, which is to be added."""
    home = _programs()
    if home is None:
        missing(
            "PostgreSQL programs (initdb, pg_ctl) not found; Debian: apt-get install postgresql"
        )
    top = Path(tempfile.mkdtemp(prefix="ebbline-postgres-"))
    user: dict[str, Any] = {}
    if os.geteuid() == 0:  # the server refuses to run as root
        try:
            shutil.chown(top, "postgres", "postgres")
        except LookupError:
            missing("run as root, and there is no user 'postgres' to start the server as")
        user = {"user": "postgres", "group": "postgres", "extra_groups": []}
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        port = probe.getsockname()[1]
    data, log = str(top / "data"), top / "log"

    def run(program: str, *arguments: str) -> None:
        done = subprocess.run(
            [str(home / program), "-D", data, *arguments],
            cwd="/",
            stdin=subprocess.DEVNULL,
            stdout=subprocess.DEVNULL,
            stderr=subprocess.PIPE,
            text=True,
            timeout=120,
            check=False,
            **user,
        )
        if done.returncode:
            raise RuntimeError(done.stderr + (log.read_text() if log.exists() else ""))

    run("initdb", "-U", "app", "--auth=trust", "--encoding=UTF8", "--locale=C.UTF-8", "--no-sync")
    listening = f"-c listen_addresses=127.0.0.1 -p {port} -c unix_socket_directories=''"
    run("pg_ctl", "-l", str(log), "-w", "-t", "60", "-o", f"{listening} {OPTIONS}", "start")
    try:
        yield f"postgresql+psycopg://app@127.0.0.1:{port}/"
    finally:
        run("pg_ctl", "-m", "immediate", "-w", "stop")
        shutil.rmtree(top, ignore_errors=True)


@contextmanager
def created(server: str, name: str) -> Iterator[str]:
    """The address of a further database on the server, empty; it is dropped afterwards."""
    _administer(server + "postgres", f"CREATE DATABASE {name}")
    yield server + name
    _administer(server + "postgres", f"DROP DATABASE {name} WITH (FORCE)")


class Reused:
    """A migrated database that is emptied rather than made anew, which takes five times as long."""

    def __init__(self, address: str) -> None:
        self.address = address
        engine = create_engine(address, poolclass=NullPool)
        tables = [one for one in inspect(engine).get_table_names() if one != "alembic_version"]
        with engine.connect() as connection:
            (version,) = connection.execute(text("SELECT version_num FROM alembic_version")).one()
        self._statements = (
            "SELECT pg_terminate_backend(pid) FROM pg_stat_activity "
            "WHERE datname = current_database() AND pid <> pg_backend_pid()",
            f"TRUNCATE {', '.join(tables)} RESTART IDENTITY",
            f"UPDATE alembic_version SET version_num = '{version}'",
        )

    def empty(self) -> None:
        """No rows, numbers from 1, nobody else connected."""
        _administer(self.address, *self._statements)


def _administer(address: str, *statements: str) -> None:
    engine = create_engine(address, poolclass=NullPool, isolation_level="AUTOCOMMIT")
    with engine.connect() as connection:
        for statement in statements:
            connection.execute(text(statement))


def _programs() -> Path | None:
    found = shutil.which("pg_ctl")
    homes = [Path(found).resolve().parent] if found else []
    homes += sorted(
        Path("/usr/lib/postgresql").glob("*/bin"), key=lambda p: float(p.parent.name), reverse=True
    )
    for home in homes:
        if (home / "initdb").exists() and (home / "pg_ctl").exists():
            return home
    return None
