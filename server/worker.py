"""The process of one job: its limits first, then the work on a connection of its own."""

import datetime as dt
import gc
import json
import sys
from pathlib import Path

from server.actions.works import works
from server.jobs.executor import run
from server.sentences.text import speaking
from server.store.connect import make_engine, sessions
from server.store.jobs import JobBook
from server.store.records import Job

SELDOM = 1_000_000  # new objects between two looks for circles: a job makes many, and ends soon


def begin(url: str, language: str, job: Job, megabytes: int) -> None:
    """Do a claimed job; how it ended is written down in the job table."""
    engine = make_engine(url)  # which loads the driver of the database
    limit(megabytes)
    gc.set_threshold(SELDOM)
    new_session = sessions(engine)
    book = JobBook(new_session, lambda: dt.datetime.now(dt.UTC))
    with speaking(language):
        run(book, job, works(new_session)[job.kind], json.loads(job.params))
    engine.dispose()


def limit(megabytes: int) -> None:
    """Let this process grow by so much and no more; only Linux says what it holds already."""
    if sys.platform == "linux":
        import resource

        pages = int(Path("/proc/self/statm").read_text().split()[0])
        most = pages * resource.getpagesize() + megabytes * 2**20
        resource.setrlimit(resource.RLIMIT_AS, (most, most))
