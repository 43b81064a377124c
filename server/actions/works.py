"""Actions that may take long, as work for an executor."""

import datetime as dt
from collections.abc import Callable, Mapping
from dataclasses import asdict
from typing import Any

from server.accounts.viewer import Right, Viewer
from server.actions.check_upload import check_upload
from server.actions.commit_upload import commit_upload
from server.jobs.executor import Tell, Work
from server.store.connect import Session
from server.store.records import Taking

KINDS = ("check", "commit")


def to_commit(
    upload: int, *, note: str, by: Viewer, now: dt.datetime, taking: Taking
) -> dict[str, Any]:
    """A commit as the parameters of a job, which are kept as JSON."""
    return {
        "upload": upload,
        "note": note,
        "by": by.name,
        "rights": sorted(right.value for right in by.rights),
        "now": now.isoformat(),
        "taking": asdict(taking),
    }


def works(new_session: Callable[[], Session]) -> dict[str, Work]:
    """Each kind of work; it opens a session of its own."""

    def check(params: Mapping[str, Any], tell: Tell) -> str:
        with new_session() as session:
            check_upload(session, upload_id=params["upload"], tell=tell)
        return ""

    def commit(params: Mapping[str, Any], tell: Tell) -> str:
        taken = params["taking"]
        with new_session() as session:
            commit_upload(
                session,
                upload_id=params["upload"],
                note=params["note"],
                by=Viewer(params["by"], frozenset(map(Right, params["rights"]))),
                now=dt.datetime.fromisoformat(params["now"]),
                taking=Taking(tuple(taken["areas"]), tuple(taken["periods"]), taken["gives_way"]),
                tell=tell,
            )
        return ""

    return {"check": check, "commit": commit}
