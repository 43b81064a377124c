"""The job table: a queue, and the truth about what became of each job."""

import datetime as dt
import hashlib
import json
from collections.abc import Callable, Mapping
from typing import Any

from sqlalchemy import insert, select, update
from sqlalchemy.orm import Session, sessionmaker

from server.store.base import LARGEST
from server.store.connect import transaction
from server.store.errors import Missing
from server.store.records import Job
from server.store.tables import Job as JobRow

_COLUMNS = tuple(getattr(JobRow, name) for name in Job.__slots__)


class JobBook:
    """Every entry is a short transaction of its own, so that others see a job's progress."""

    def __init__(self, sessions: sessionmaker[Session], clock: Callable[[], dt.datetime]) -> None:
        self._sessions, self._clock = sessions, clock

    def queue(self, kind: str, params: Mapping[str, Any]) -> Job:
        written = json.dumps(params, sort_keys=True, ensure_ascii=False)
        row = insert(JobRow).values(
            kind=kind,
            params=written,
            digest=hashlib.sha256(f"{kind}\0{written}".encode()).hexdigest(),
            state="queued",
            done=0,
            total=0,
            message="",
            attempt=0,
            beat=0,
            queued=self._clock(),
        )
        with self._sessions() as session, transaction(session):
            return Job(*session.execute(row.returning(*_COLUMNS)).one())

    def find(self, job_id: int) -> Job:
        """Raises: Missing."""
        which = JobRow.id == min(job_id, LARGEST)
        with self._sessions() as session:
            row = session.execute(select(*_COLUMNS).where(which)).one_or_none()
        if row is None:
            raise Missing("job", job_id)
        return Job(*row)

    def claim(self, job_id: int | None = None) -> Job | None:
        """Take the oldest queued job, or this one, as running; None where there is none queued.
        No two workers get the same."""
        oldest = select(JobRow.id).where(JobRow.state == "queued").order_by(JobRow.id).limit(1)
        if job_id is not None:
            oldest = oldest.where(JobRow.id == job_id)
        taken = (
            update(JobRow)
            .where(JobRow.id == oldest.with_for_update(skip_locked=True).scalar_subquery())
            .values(state="running", attempt=JobRow.attempt + 1, started=self._clock())
            .returning(*_COLUMNS)
        )
        with self._sessions() as session, transaction(session):
            row = session.execute(taken).one_or_none()
        return None if row is None else Job(*row)

    def progress(self, job: Job, *, done: int, total: int, message: str) -> bool:
        """A sign of life; False where the job was cancelled or begun again by another."""
        return self._write(job, done=done, total=total, message=message, beat=JobRow.beat + 1)

    def close(self, job: Job, state: str, message: str) -> bool:
        """Done or failed; False as for `progress`."""
        return self._write(job, state=state, message=message, ended=self._clock())

    def holds(self, job: Job) -> bool:
        """Whether it still runs, under this attempt."""
        found = self.find(job.id)
        return found.state == "running" and found.attempt == job.attempt

    def abandon(self, message: str) -> None:
        """Close as failed what another server left queued or running."""
        left = update(JobRow).where(JobRow.state.in_(("queued", "running")))
        with self._sessions() as session, transaction(session):
            session.execute(left.values(state="failed", message=message, ended=self._clock()))

    def cancel(self, job_id: int) -> Job:
        """Keep a queued job from starting, or a running one from writing on. One that has ended
        stays as it is. Raises: Missing."""
        self._update(
            JobRow.id == job_id,
            JobRow.state.in_(("queued", "running")),
            state="cancelled",
            ended=self._clock(),
        )
        return self.find(job_id)

    def _write(self, job: Job, **values: Any) -> bool:
        return self._update(
            JobRow.id == job.id,
            JobRow.attempt == job.attempt,
            JobRow.state == "running",
            **values,
        )

    def _update(self, *which: Any, **values: Any) -> bool:
        changed = update(JobRow).where(*which).values(**values).returning(JobRow.id)
        with self._sessions() as session, transaction(session):
            return session.execute(changed).one_or_none() is not None
