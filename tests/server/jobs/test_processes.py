"""Jobs in processes of their own: they end when their time, memory or patience is up."""

import datetime as dt
import os
import time
from collections.abc import Callable, Iterator
from functools import partial

import pytest

from server import worker
from server.accounts.viewer import LOCAL
from server.actions.map_upload import map_upload
from server.actions.receive_upload import receive_upload
from server.jobs.executor import TOO_LARGE, run
from server.jobs.processes import DIED, STOPPED, TOO_LONG, Limits, Processes
from server.store import uploads
from server.store.connect import make_engine, sessions
from server.store.jobs import JobBook
from server.store.records import Job
from tests.factories import BASIS, COLUMNS, counts_csv, stored_collection

NOW = dt.datetime(2026, 12, 1, 12, tzinfo=dt.UTC)


def _work(url: str, job: Job, megabytes: int) -> None:
    """What the process of a job does here, by the kind of the job."""
    worker.limit(megabytes)
    book = JobBook(sessions(make_engine(url)), lambda: NOW)

    def count(_params: object, tell: Callable[..., None]) -> str:
        tell(1, 2, "half")
        return "counted"

    def sleep(_params: object, tell: Callable[..., None]) -> str:
        tell(0, 1, "asleep")
        time.sleep(60)
        return "never"

    def grow(_params: object, _tell: object) -> str:
        return str(len(bytearray(10**9)))

    def die(_params: object, _tell: object) -> str:
        os._exit(7)

    run(book, job, {"count": count, "sleep": sleep, "grow": grow, "die": die}[job.kind], {})


@pytest.fixture
def book(db_url: str) -> Iterator[JobBook]:
    engine = make_engine(db_url)
    yield JobBook(sessions(engine), lambda: NOW)
    engine.dispose()


AT_ONCE = 2


@pytest.fixture
def jobs(db_url: str, book: JobBook) -> Iterator["Processes[Job]"]:
    kinds = ("count", "sleep", "grow", "die")
    limits, begin = Limits(seconds=30, megabytes=300), partial(_work, db_url)
    made = Processes(book, kinds, begin, limits, preload="server.worker", at_once=AT_ONCE)
    yield made
    for _ in range(AT_ONCE):  # its watchers are done before their database goes
        assert made._free.acquire(timeout=30)


def _ended(book: JobBook, number: int) -> Job:
    return _when(book, number, lambda job: job.state not in ("queued", "running"))


def _when(book: JobBook, number: int, so: Callable[[Job], bool]) -> Job:
    for _ in range(1500):
        if so(job := book.find(number)):
            return job
        time.sleep(0.02)
    raise AssertionError(f"job {number} stands at {book.find(number)}")


def test_work_is_done_in_another_process_and_written_down(
    jobs: "Processes[Job]", book: JobBook
) -> None:
    ended = _ended(book, jobs.submit("count", {}))
    assert (ended.state, ended.message, ended.done, ended.total) == ("done", "counted", 1, 2)


def test_work_that_needs_too_much_memory_fails_and_says_so(
    jobs: "Processes[Job]", book: JobBook
) -> None:
    ended = _ended(book, jobs.submit("grow", {}))
    assert (ended.state, ended.message) == ("failed", TOO_LARGE)


def test_a_process_that_dies_fails_its_job(jobs: "Processes[Job]", book: JobBook) -> None:
    ended = _ended(book, jobs.submit("die", {}))
    assert (ended.state, ended.message) == ("failed", DIED)


def test_a_cancelled_job_is_ended_at_once_though_it_says_nothing(
    jobs: "Processes[Job]", book: JobBook
) -> None:
    number = jobs.submit("sleep", {})
    _when(book, number, lambda job: job.message == "asleep")
    book.cancel(number)
    following = [_ended(book, jobs.submit("count", {})) for _ in range(3)]
    assert [job.state for job in following] == ["done"] * 3  # its place was given back
    assert book.find(number).state == "cancelled"


def test_work_that_takes_too_long_is_ended(db_url: str, book: JobBook) -> None:
    limits = Limits(seconds=1, megabytes=300)
    jobs = Processes(book, ("sleep",), partial(_work, db_url), limits, preload="server.worker")
    ended = _ended(book, jobs.submit("sleep", {}))
    assert (ended.state, ended.message) == ("failed", TOO_LONG)


def test_what_a_stopped_server_left_is_closed_by_the_next(db_url: str, book: JobBook) -> None:
    running, waiting = book.queue("count", {}), book.queue("count", {})
    book.claim(running.id)
    Processes(book, ("count",), partial(_work, db_url), Limits(1, 1), preload="server.worker")
    found = [book.find(job.id) for job in (running, waiting)]
    assert [(job.state, job.message) for job in found] == [("failed", STOPPED)] * 2


def test_a_kind_of_work_that_is_not_known_is_refused(jobs: "Processes[Job]") -> None:
    with pytest.raises(ValueError, match="no work of kind 'paint'; the kinds are"):
        jobs.submit("paint", {})


@pytest.mark.parametrize(
    ("megabytes", "state", "message"), [(4, "failed", TOO_LARGE), (300, "done", "")]
)
def test_a_check_without_memory_ends_with_the_sentence_and_changes_nothing(
    sqlite_url: str, megabytes: int, state: str, message: str
) -> None:
    engine = make_engine(sqlite_url)
    book = JobBook(sessions(engine), lambda: NOW)
    with sessions(engine)() as session:
        stored_collection(session)
        files = [("counts", "counts.csv", counts_csv(map("a{:04}".format, range(2_000))))]
        upload = receive_upload(session, collection="saltmarsh", files=files, by=LOCAL, now=NOW)
        mappings = {"counts": COLUMNS}
        map_upload(session, upload_id=upload.id, mappings=mappings, basis=BASIS, by=LOCAL, now=NOW)
        begin = partial(worker.begin, sqlite_url, "en")
        limits = Limits(seconds=60, megabytes=megabytes)
        jobs = Processes(book, ("check",), begin, limits, preload="server.worker")
        ended = _ended(book, jobs.submit("check", {"upload": upload.id}))
        assert (ended.state, ended.message) == (state, message)
        session.rollback()
        assert bool(uploads.find(session, upload.id).report) == (state == "done")
    engine.dispose()
