"""The seam between asking for work and doing it. The job table is the truth; an executor only
decides where and when the work runs."""

from collections.abc import Callable, Collection, Mapping
from typing import Any, Protocol, TypeVar

# closing messages of a job, texts of the catalogue
TOO_LARGE = (
    "It needs more memory than this server allows. Hand in fewer years at a time, or raise "
    "EBBLINE_WORK_MEGABYTES."
)


class Claimed(Protocol):
    """A job as its book hands it out."""

    @property
    def id(self) -> int: ...

    @property
    def kind(self) -> str: ...


Entry = TypeVar("Entry", bound=Claimed)


class Book(Protocol[Entry]):
    """Where jobs are written down; the store keeps one."""

    def queue(self, kind: str, params: Mapping[str, Any], /) -> Entry: ...
    def claim(self, job_id: int | None = None, /) -> Entry | None: ...
    def progress(self, job: Entry, /, *, done: int, total: int, message: str) -> bool: ...
    def close(self, job: Entry, state: str, message: str, /) -> bool: ...
    def holds(self, job: Entry, /) -> bool: ...
    def abandon(self, message: str, /) -> None: ...


class Cancelled(Exception):
    """The job was cancelled, or another worker began it again; the work ends here."""


class Tell(Protocol):
    """Tell how far the work is. Raises: Cancelled."""

    def __call__(self, done: int, total: int, message: str = "") -> None: ...


def untold(done: int, total: int, message: str = "") -> None:
    """Where nobody wants to know."""


Work = Callable[[Mapping[str, Any], Tell], str]  # gives the closing message


class Executor(Protocol):
    def submit(self, kind: str, params: Mapping[str, Any]) -> int:
        """Queue the work and see that it is done; gives the job's number. ValueError where there
        is no such kind, listing those there are."""
        ...


class Inline:
    """Does the work at once, in the thread that asks; for short work and for tests."""

    def __init__(self, book: Book[Any], works: Mapping[str, Work]) -> None:
        self._book, self._works = book, works

    def submit(self, kind: str, params: Mapping[str, Any]) -> int:
        require_kind(kind, self._works)
        queued = self._book.queue(kind, params)
        if job := self._book.claim(queued.id):
            run(self._book, job, self._works[kind], params)
        return int(queued.id)


def require_kind(kind: str, kinds: Collection[str]) -> None:
    """Raises: ValueError where there is no such kind of work, listing those there are."""
    if kind not in kinds:
        raise ValueError(f"no work of kind {kind!r}; the kinds are {sorted(kinds)}")


def run(book: Book[Entry], job: Entry, work: Work, params: Mapping[str, Any]) -> None:
    """Do a claimed job and write down how it ended. An exception fails the job with its text."""

    def tell(done: int, total: int, message: str = "") -> None:
        if not book.progress(job, done=done, total=total, message=message):
            raise Cancelled

    try:
        message = work(params, tell)
    except Cancelled:
        return
    except MemoryError:
        book.close(job, "failed", TOO_LARGE)
    except Exception as error:  # whatever goes wrong in the work must not end the worker
        words = str(error) if hasattr(error, "text") else f"{type(error).__name__}: {error}"
        book.close(job, "failed", words)
    else:
        book.close(job, "done", message)
