"""Jobs run inline, written down on both databases."""

import datetime as dt
from collections.abc import Mapping
from threading import Thread
from typing import Any

import pytest
from sqlalchemy.orm import Session, sessionmaker

from server.jobs.executor import Inline, Tell
from server.store.errors import Missing
from server.store.jobs import JobBook
from server.store.records import Job

NOW = dt.datetime(2026, 12, 1, 12, tzinfo=dt.UTC)


@pytest.fixture
def book(new_session: sessionmaker[Session]) -> JobBook:
    return JobBook(new_session, lambda: NOW)


def test_a_job_runs_in_the_calling_thread_and_is_written_down(book: JobBook) -> None:
    seen: list[Job] = []

    def counting(params: Mapping[str, Any], tell: Tell) -> str:
        tell(1, params["steps"], "one")
        tell(2, params["steps"], "two")
        seen.append(book.find(1))
        return "counted"

    assert Inline(book, {"count": counting}).submit("count", {"steps": 3}) == 1
    running, ended = seen[0], book.find(1)
    assert (running.state, running.done, running.total, running.message) == ("running", 2, 3, "two")
    assert (running.attempt, running.beat, running.started) == (1, 2, NOW)
    assert (ended.state, ended.message, ended.ended) == ("done", "counted", NOW)


def test_work_that_fails_fails_its_job_with_the_reason(book: JobBook) -> None:
    def failing(_params: Mapping[str, Any], _tell: Tell) -> str:
        raise ValueError("no population in 2014")

    number = Inline(book, {"fail": failing}).submit("fail", {})
    ended = book.find(number)
    assert (ended.state, ended.message) == ("failed", "ValueError: no population in 2014")


def test_a_cancelled_job_stops_at_its_next_word_and_stays_cancelled(book: JobBook) -> None:
    reached: list[int] = []

    def long(_params: Mapping[str, Any], tell: Tell) -> str:
        for step in range(10):
            reached.append(step)
            if step == 3:
                book.cancel(1)
            tell(step, 10)
        return "never"

    Inline(book, {"long": long}).submit("long", {})
    assert reached == [0, 1, 2, 3]
    assert (book.find(1).state, book.find(1).done) == ("cancelled", 2)
    assert book.cancel(1).state == "cancelled"


def test_a_cancelled_job_is_not_claimed(book: JobBook) -> None:
    first, second = book.queue("a", {}), book.queue("b", {})
    book.cancel(first.id)
    claimed = book.claim()
    assert claimed is not None
    assert (claimed.id, claimed.state) == (second.id, "running")
    assert book.claim() is None


def test_only_the_attempt_that_holds_the_job_writes(book: JobBook) -> None:
    book.queue("a", {})
    late = book.claim()
    assert late is not None
    earlier = Job(**{name: getattr(late, name) for name in Job.__slots__} | {"attempt": 0})
    assert book.progress(late, done=1, total=2, message="")
    assert not book.progress(earlier, done=2, total=2, message="")
    assert not book.close(earlier, "done", "")
    assert book.find(late.id).done == 1


def test_the_same_request_has_the_same_digest(book: JobBook) -> None:
    digests = [
        book.queue(kind, params).digest
        for kind, params in (
            ("a", {"x": 1, "y": 2}),
            ("a", {"y": 2, "x": 1}),
            ("b", {"x": 1, "y": 2}),
        )
    ]
    assert digests[0] == digests[1] != digests[2]


def test_two_claimants_never_get_the_same_job(book: JobBook) -> None:
    for _ in range(12):
        book.queue("a", {})
    got: list[int] = []

    def claim_all() -> None:
        while job := book.claim():
            got.append(job.id)

    threads = [Thread(target=claim_all) for _ in range(4)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert sorted(got) == list(range(1, 13))


def test_an_unknown_kind_and_an_unknown_job_are_refused(book: JobBook) -> None:
    with pytest.raises(ValueError, match=r"no work of kind 'sing'; the kinds are \['count'\]"):
        Inline(book, {"count": lambda _params, _tell: ""}).submit("sing", {})
    with pytest.raises(Missing, match=r"There is no job 1\.$"):
        book.find(1)
