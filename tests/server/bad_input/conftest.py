"""Edition 1 of a collection, a browser and a terminal to make mistakes with. Whatever is wrong,
the database must be as it was, and the server must go on serving."""

import html
import re
import sqlite3
from collections.abc import Iterator
from contextlib import closing
from dataclasses import dataclass
from pathlib import Path

import pytest
from httpx2 import Response
from starlette.testclient import TestClient

from server.accounts.viewer import LOCAL
from server.actions.commit_upload import commit_upload
from server.app import create_app
from server.cli import main
from server.config import Config
from server.store.connect import make_engine, sessions
from server.store.migrating import migrate
from tests.factories import NOON, checked_upload, counts_csv, stored_collection
from tests.server.web.site import browser

LIMIT = 1_000_000
EDITION = "/c/saltmarsh/1"
CHOICES = "&figures=released&settings=almanac-1"
GOOD = f"{EDITION}/population-year?of=north.f.2001{CHOICES}"
# a draft with faults is kept, was checked, and what it would change was worked out
DRAFTS = {"upload", "upload_file", "job", "foreseen"}
PROBLEM = "application/problem+json"


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A data folder in which edition 1 of a collection stands."""
    made = tmp_path_factory.mktemp("bad-input")
    migrate(Config(data=made).url)
    engine = make_engine(Config(data=made).url)
    with sessions(engine)() as session:
        stored_collection(session)
        upload = checked_upload(session, counts_csv())
        commit_upload(session, upload_id=upload.id, note="First.", by=LOCAL, now=NOON)
    engine.dispose()
    return made


@pytest.fixture(scope="module")
def running(folder: Path) -> Iterator[TestClient]:
    with browser(create_app(Config(data=folder, upload_limit=LIMIT))) as reader:
        yield reader


@pytest.fixture
def reader(running: TestClient, folder: Path) -> Iterator[TestClient]:
    """A browser after whose faults no edition has changed and pages are still served."""
    before = kept(folder)
    yield running
    assert kept(folder) == before
    assert running.get(GOOD, headers={"Cache-Control": "no-cache"}).status_code == 200


def kept(folder: Path) -> dict[str, list[tuple[object, ...]]]:
    """Every row of every table but the drafts'."""
    with closing(sqlite3.connect(folder / "ebbline.db")) as database:
        names = [
            name
            for (name,) in database.execute(
                "SELECT name FROM sqlite_master WHERE type = 'table' AND name NOT LIKE 'sqlite_%'"
            )
        ]
        assert set(names) >= {"collection", "edition", "edition_event", "schedule", "area", "basis"}
        return {
            name: database.execute(f"SELECT * FROM {name} ORDER BY rowid").fetchall()
            for name in names
            if name not in DRAFTS
        }


def words(page: Response) -> str:
    """What a page says, without its marks."""
    text = re.sub(r"<(script|style).*?</\1>", " ", page.text, flags=re.DOTALL)
    return " ".join(html.unescape(re.sub(r"<[^>]+>", " ", text)).split())


@dataclass(frozen=True, slots=True)
class Said:
    code: int
    out: str
    err: str


@pytest.fixture
def ebbline(
    folder: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> Iterator["Terminal"]:
    """A terminal after whose faults no table has changed, drafts' neither."""
    monkeypatch.setenv("EBBLINE_DATA", str(folder))
    monkeypatch.setenv("EBBLINE_UPLOAD_LIMIT", str(LIMIT))
    before = kept(folder)
    yield Terminal(capsys)
    assert kept(folder) == before


class Terminal:
    def __init__(self, capsys: pytest.CaptureFixture[str]) -> None:
        self._capsys = capsys

    def __call__(self, *arguments: str | Path) -> Said:
        self._capsys.readouterr()
        try:
            code = main([str(one) for one in arguments])
        except SystemExit as ended:
            code = int(ended.code or 0)
        return Said(code, *self._capsys.readouterr())
