"""How far the reading and checking of an upload is, or the making of an edition of it."""

from dataclasses import dataclass
from typing import ClassVar

from server.pages.page import Frame, Page
from server.pages.upload import locator
from server.sentences import uploads as say
from server.sentences.pieces import phrase
from server.sentences.text import _
from server.store import collections, uploads
from server.store.connect import Session
from server.store.records import Job


@dataclass(frozen=True, slots=True, kw_only=True)
class UploadCheckingPage(Page):
    """Is it being read, or made an edition, still?"""

    template: ClassVar[str] = "upload_checking/page.html"
    place: str  # address of the upload
    here: str
    running: bool
    done: int
    total: int
    job: int
    checked: bool  # before this work: the way back is to what was found


def build(session: Session, upload_id: int, job: Job) -> UploadCheckingPage:
    upload = uploads.find(session, upload_id)
    collection = collections.find(session, upload.collection)
    here = f"/uploads/{upload.id}/checking?job={job.id}"
    committing = job.kind == "commit"
    at = _("making an edition") if committing else _("reading and checking")
    return UploadCheckingPage(
        frame=Frame(
            title=_("An edition is made") if committing else _("The files are read and checked"),
            address=here,
            locator=locator(upload, collection, phrase(at)),
            shown=_("Not an edition"),
            nav="upload",
        ),
        answer=(say.committing if committing else say.checking)(job.state, job.message),
        lead=(
            say.committing_further(job.state)
            if committing
            else say.checking_further(job.state, reported=bool(upload.report))
        ),
        place=f"/uploads/{upload.id}",
        here=here,
        running=job.state in ("queued", "running"),
        done=job.done,
        total=job.total,
        job=job.id,
        checked=job.kind != "check",
    )
