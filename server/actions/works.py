"""Actions that may take long, as work for an executor."""

from collections.abc import Callable, Mapping
from typing import Any

from server.actions.check_upload import check_upload
from server.jobs.executor import Tell, Work
from server.store.connect import Session

KINDS = ("check",)


def works(new_session: Callable[[], Session]) -> dict[str, Work]:
    """Each kind of work; it opens a session of its own."""

    def check(params: Mapping[str, Any], tell: Tell) -> str:
        with new_session() as session:
            check_upload(session, upload_id=params["upload"], tell=tell)
        return ""

    return {"check": check}
