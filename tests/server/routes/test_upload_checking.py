"""The page that tells how far the checks of an upload are, where they take longer than a moment."""

from collections.abc import Callable, Iterator, Mapping
from typing import Any

import pytest
from fastapi import FastAPI
from starlette.testclient import TestClient

from server.app import create_app
from server.config import Config
from server.jobs.executor import TOO_LARGE, Tell, run
from server.routes import uploads
from server.store.connect import Session
from server.store.jobs import JobBook
from tests.factories import counts_csv
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
        tell(1, 3, "reading and checking the rows")
        pages.append(client.get(place).text)
        return ""

    at_work(app, checking)
    assert "The files are being read: reading and checking the rows." in pages[0]
    assert "1 of 3 steps done" in pages[0]
    assert "every 1s" in pages[0]
    done = client.get(place)
    assert (done.status_code, done.headers["location"]) == (302, "/uploads/1/problems")
    partial = {"hx-request-type": "partial", "hx-target": "div#checking"}
    assert client.get(place, headers=partial).headers["hx-redirect"] == "/uploads/1/problems"


def test_it_can_be_stopped(app: FastAPI, client: TestClient, place: str) -> None:
    stopped = client.post("/uploads/1/checking/cancel", data={"job": "1"})
    assert (stopped.status_code, stopped.headers["location"]) == (303, place)
    page = client.get(place).text
    assert "The reading was stopped. Nothing was changed." in page
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
