"""Actions that may take long, as work for an executor."""

import datetime as dt
from collections.abc import Callable, Mapping
from dataclasses import asdict
from typing import Any

from server.accounts.viewer import Right, Viewer
from server.actions.check_upload import check_upload
from server.actions.commit_upload import commit_upload
from server.actions.preview_upload import foresee_upload
from server.jobs.executor import Tell, Work
from server.store.connect import Session
from server.store.records import Taking

KINDS = ("check", "commit", "foresee")


def to_commit(
    upload: int, *, note: str, by: Viewer, now: dt.datetime, taking: Taking
) -> dict[str, Any]:
    """A commit as the parameters of a job, which are kept as JSON."""
    return {"note": note, "now": now.isoformat(), **to_foresee(upload, by=by, taking=taking)}


def to_foresee(upload: int, *, by: Viewer, taking: Taking) -> dict[str, Any]:
    """The same of a look at what an edition would change."""
    return {
        "upload": upload,
        "by": by.name,
        "rights": sorted(right.value for right in by.rights),
        "taking": asdict(taking),
    }


def taking_of(params: Mapping[str, Any]) -> Taking:
    """What is taken, of the parameters of such a job."""
    taken = params["taking"]
    return Taking(tuple(taken["areas"]), tuple(taken["periods"]), taken["gives_way"])


def _viewer(params: Mapping[str, Any]) -> Viewer:
    return Viewer(params["by"], frozenset(map(Right, params["rights"])))


def works(new_session: Callable[[], Session]) -> dict[str, Work]:
    """Each kind of work; it opens a session of its own."""

    def check(params: Mapping[str, Any], tell: Tell) -> str:
        with new_session() as session:
            check_upload(session, upload_id=params["upload"], tell=tell)
        return ""

    def commit(params: Mapping[str, Any], tell: Tell) -> str:
        with new_session() as session:
            commit_upload(
                session,
                upload_id=params["upload"],
                note=params["note"],
                by=_viewer(params),
                now=dt.datetime.fromisoformat(params["now"]),
                taking=taking_of(params),
                tell=tell,
            )
        return ""

    def foresee(params: Mapping[str, Any], tell: Tell) -> str:
        by, taking = _viewer(params), taking_of(params)
        with new_session() as session:
            foresee_upload(session, upload_id=params["upload"], taking=taking, by=by, tell=tell)
        return ""

    return {"check": check, "commit": commit, "foresee": foresee}
