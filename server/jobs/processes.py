"""Each job in a process of its own, watched: it ends when its time is up or it was cancelled."""

import multiprocessing
import threading
import time
from collections.abc import Callable, Collection, Mapping
from dataclasses import dataclass
from multiprocessing.process import BaseProcess
from typing import Any, Generic

from server.jobs.executor import Book, Entry, require_kind

WATCHED = 0.1  # seconds between two looks at a job

# closing messages of a job, texts of the catalogue; what it had written by then, the page looks up
TOO_LONG = (
    "It took longer than this server allows. Hand in fewer years at a time, or raise "
    "EBBLINE_WORK_SECONDS."
)
DIED = "The process that did it ended unexpectedly."
STOPPED = "The server was stopped before it had ended."


@dataclass(frozen=True, slots=True)
class Limits:
    """Of one job."""

    seconds: int
    megabytes: int  # beyond what a process of ours holds before it begins


class Processes(Generic[Entry]):
    """Starts a process for each job, a few at a time; the job table stays the truth.

    `begin(job, megabytes)` does the work in the new process, which has loaded the module `preload`
    already.
    """

    def __init__(
        self,
        book: Book[Entry],
        kinds: Collection[str],
        begin: Callable[[Entry, int], None],
        limits: Limits,
        *,
        preload: str,
        at_once: int = 2,
    ) -> None:
        self._book, self._kinds, self._begin, self._limits = book, kinds, begin, limits
        self._free = threading.BoundedSemaphore(at_once)
        # a clean process that is forked from: quick to start, and free of the server's threads
        self._context = multiprocessing.get_context("forkserver")
        self._context.set_forkserver_preload([preload])
        book.abandon(STOPPED)

    def submit(self, kind: str, params: Mapping[str, Any]) -> int:
        """Queue the work and see that it is done; gives the job's number. ValueError where there
        is no such kind."""
        require_kind(kind, self._kinds)
        number = self._book.queue(kind, params).id
        threading.Thread(target=self._see_to, args=(number,), daemon=True).start()
        return number

    def _see_to(self, number: int) -> None:
        with self._free:
            if job := self._book.claim(number):
                process = self._context.Process(
                    target=self._begin, args=(job, self._limits.megabytes), daemon=True
                )
                process.start()
                if message := self._watch(job, process):
                    self._book.close(job, "failed", message)

    def _watch(self, job: Entry, process: BaseProcess) -> str:
        """Why the job must be closed as failed; empty where it was closed or cancelled."""
        end = time.monotonic() + self._limits.seconds
        while process.exitcode is None:
            process.join(WATCHED)
            late = time.monotonic() > end
            if process.exitcode is None and (late or not self._book.holds(job)):
                process.kill()
                process.join()
                return TOO_LONG if late else ""
        return "" if process.exitcode == 0 else DIED
