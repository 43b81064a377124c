"""The page that tells how far the checks of an upload are, where they take longer than a moment."""

import json
from collections.abc import Callable, Iterator, Mapping
from typing import Any

import pytest
from fastapi import FastAPI
from starlette.testclient import TestClient

from server.accounts.viewer import LOCAL
from server.actions import weighing
from server.actions.check_upload import check_upload
from server.actions.commit_upload import commit_upload
from server.actions.works import works
from server.app import create_app
from server.config import Config
from server.jobs.executor import TOO_LARGE, Tell, run
from server.jobs.processes import DIED, STOPPED
from server.routes import uploads
from server.store import editions, schedules
from server.store.connect import Session
from server.store.jobs import JobBook
from server.store.records import Taking
from tests.factories import NOON, counts_csv
from tests.server.routes.test_uploads import AREAS, draft
from tests.server.web.site import browser


class Later:
    """Queues what is asked for; a test has it done, as far as it wants."""

    def __init__(self, book: JobBook, _new_session: Callable[[], Session]) -> None:
        self.book = book

    def submit(self, kind: str, params: Mapping[str, Any]) -> int:
        return self.book.queue(kind, params).id


@pytest.fixture
def app(sqlite_url: str, monkeypatch: pytest.MonkeyPatch) -> FastAPI:
    monkeypatch.setattr(uploads, "A_MOMENT", 0.0)
    return create_app(Config(database_url=sqlite_url), Later)


@pytest.fixture
def client(app: FastAPI) -> Iterator[TestClient]:
    with browser(app) as reader:
        yield reader


@pytest.fixture
def place(client: TestClient) -> str:
    """The address at which the checks of a draft are watched."""
    upload = draft(client, counts_csv())
    asked = client.post(f"{upload}/reading", data=AREAS)
    assert asked.status_code == 303
    assert asked.headers["location"] == f"{upload}/checking?job=1"
    return str(asked.headers["location"])


def at_work(app: FastAPI, work: Callable[[Mapping[str, Any], Tell], str]) -> None:
    book = app.state.book
    run(book, book.claim(), work, {})


def test_it_waits_then_says_what_is_done_and_leads_to_what_was_found(
    app: FastAPI, client: TestClient, place: str
) -> None:
    assert "The files wait for their turn." in client.get(place).text
    pages = []

    def checking(_params: object, tell: Tell) -> str:
        tell(1, 4, "reading the rows")
        pages.append(client.get(place).text)
        return ""

    at_work(app, checking)
    assert "The files are being read: reading the rows." in pages[0]
    assert "1 of 4 steps done" in pages[0]
    assert "every 1s" in pages[0]
    done = client.get(place)
    assert (done.status_code, done.headers["location"]) == (302, "/uploads/1/problems")
    partial = {"hx-request-type": "partial", "hx-target": "div#checking"}
    assert client.get(place, headers=partial).headers["hx-redirect"] == "/uploads/1/problems"


def test_it_can_be_stopped(app: FastAPI, client: TestClient, place: str) -> None:
    stopped = client.post("/uploads/1/checking/cancel", data={"job": "1"})
    assert (stopped.status_code, stopped.headers["location"]) == (303, place)
    page = client.get(place).text
    assert "The reading was stopped." in page
    assert "No report of these files has been written so far." in page
    assert "every 1s" not in page
    assert app.state.book.claim() is None


def test_why_it_failed_is_said(app: FastAPI, client: TestClient, place: str) -> None:
    def greedy(_params: object, _tell: object) -> str:
        raise MemoryError

    at_work(app, greedy)
    page = client.get(place).text
    assert TOO_LARGE in page
    assert "Check the same files again" in page


@pytest.mark.parametrize("job", ["", "2", "x", "²", "99999999999999999999"])
def test_a_job_that_is_not_of_this_upload_is_no_page(
    app: FastAPI, client: TestClient, place: str, job: str
) -> None:
    app.state.book.queue("check", {"upload": 77})
    assert client.get(f"/uploads/1/checking?job={job}").status_code == 404
    assert client.post("/uploads/1/checking/cancel", data={"job": job}).status_code == 404


def checked(client: TestClient, app: FastAPI, content: bytes = b"") -> None:
    """Upload 1, ready to become an edition."""
    upload = draft(client, content or counts_csv())
    client.post(f"{upload}/reading", data=AREAS)
    do(app)


def do(app: FastAPI) -> None:
    """The work asked for last, as a worker does it."""
    job = app.state.book.claim()
    run(app.state.book, job, works(app.state.sessions)[job.kind], json.loads(job.params))


def test_a_large_upload_is_made_an_edition_by_a_worker(
    app: FastAPI, client: TestClient, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(weighing, "ROWS", 10)
    checked(client, app)
    asked = client.post("/uploads/1/commit", data={"note": "as delivered", "years": "2002"})
    looked = asked.headers["location"]  # first it is shown
    assert looked == "/uploads/1/checking?job=2"
    do(app)
    shown = client.get(looked)
    assert shown.headers["location"] == "/uploads/1/problems?years=2002&gives_way=cells#effect"
    chosen = {"note": "as delivered", "years": "2002", "shown": "years=2002&gives_way=cells"}
    asked = client.post("/uploads/1/commit", data=chosen)
    place = asked.headers["location"]
    assert (asked.status_code, place) == (303, "/uploads/1/checking?job=3")
    page = client.get(place).text
    assert "The upload waits for its turn." in page
    assert "Either the whole edition is made or nothing of it." in page
    do(app)
    done = client.get(place)
    assert (done.status_code, done.headers["location"]) == (302, "/c/dk/1/contents")
    with app.state.sessions() as session:
        edition = editions.find(session, "dk", 1)
        assert edition is not None
        assert (edition.taking, edition.note) == (Taking(periods=("2002",)), "as delivered")
        assert schedules.contents(session, "dk", 1).periods == ("2002",)


def test_what_can_be_told_is_refused_before_a_worker_is_asked(
    app: FastAPI, client: TestClient, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(weighing, "ROWS", 10)
    checked(client, app)
    client.post("/uploads/1/commit", data={"note": "first"})
    do(app)
    again = client.post("/uploads/1/commit", data={"note": "again"})
    assert again.status_code == 409
    assert "Upload 1 is edition 1 already." in again.text
    assert app.state.book.claim() is None


def test_why_no_edition_was_made_is_said(
    app: FastAPI, client: TestClient, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(weighing, "ROWS", 10)
    checked(client, app)
    client.post("/uploads/1/commit", data={"note": "late"})
    other = draft(client, counts_csv(), collection="dk")
    client.post(f"{other}/reading", data=AREAS)
    with app.state.sessions() as session:
        check_upload(session, upload_id=2)
        commit_upload(session, upload_id=2, note="first", by=LOCAL, now=NOON)
    do(app)
    page = client.get("/uploads/1/checking?job=2").text
    assert "The edition could not be made. The checks ran against no edition" in page
    assert "No edition has been made of this upload so far." in page
    assert "Back to the upload" in page


@pytest.mark.parametrize("message", [DIED, STOPPED])
def test_a_commit_that_was_written_before_its_process_died_is_no_failure(
    app: FastAPI, client: TestClient, monkeypatch: pytest.MonkeyPatch, message: str
) -> None:
    """Between the edition and the last word of its job the process may end: it is looked up."""
    monkeypatch.setattr(weighing, "ROWS", 10)
    checked(client, app)
    client.post("/uploads/1/commit", data={"note": "as delivered"})
    job = app.state.book.claim()
    place = f"/uploads/1/checking?job={job.id}"
    app.state.book.close(job, "failed", message)
    page = client.get(place).text
    assert f"The edition could not be made. {message}" in page
    assert "No edition has been made of this upload so far." in page
    assert "Nothing was changed" not in page
    with app.state.sessions() as session:
        commit_upload(session, upload_id=1, note="as delivered", by=LOCAL, now=NOON)
    assert client.get(place).headers["location"] == "/c/dk/1/contents"


def test_a_check_that_wrote_its_report_before_its_process_died_is_said(
    app: FastAPI, client: TestClient, place: str
) -> None:
    job = app.state.book.claim()
    with app.state.sessions() as session:
        check_upload(session, upload_id=1)
    app.state.book.close(job, "failed", DIED)
    page = client.get(place).text
    assert DIED in page
    assert "A report of what the checks found stands under the upload." in page
