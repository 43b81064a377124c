"""From files to an edition: /uploads, /uploads/new, /uploads/{upload} and its steps."""

import datetime as dt
import json
import time
from typing import Any

from fastapi import APIRouter, Request, Response

from server.accounts.viewer import Right, Viewer
from server.actions.commit_upload import commit_upload, require_ready, require_sound
from server.actions.correct_upload import correct_upload
from server.actions.discard_upload import discard_upload
from server.actions.drafts import require_checkable
from server.actions.erase_bytes import erase_bytes
from server.actions.preview_upload import preview_upload
from server.actions.weighing import takes_long
from server.actions.works import taking_of as taking_of_job
from server.actions.works import to_commit, to_foresee
from server.pages import upload as upload_page
from server.pages import upload_checking, upload_problems
from server.pages import uploads as uploads_page
from server.results.preview import asked, taking_of
from server.routes import plain
from server.routes.asking import Elsewhere, SessionDep, ViewerDep, needs
from server.routes.forms import FormDep, file, text
from server.store import uploads
from server.store.connect import Session
from server.store.errors import Missing, Refused
from server.store.records import Job, Taking
from server.web.problem import Refusal
from server.web.render import READ, asked_block, redirect, render

router = APIRouter()
MAY_READ = [needs(Right.READ)]
MAY_UPLOAD = [needs(Right.UPLOAD)]
CHOICES = ("area", "years", "gives_way")  # of what is taken of an upload
A_MOMENT = 2.0  # seconds a reader waits for the checks without being told how far they are


@router.api_route("/uploads", methods=READ, dependencies=MAY_READ)
def show_all(request: Request, session: SessionDep) -> Response:
    plain.keys(request)
    return render(request, uploads_page.build(session))


@router.api_route("/uploads/{upload:int}", methods=READ, dependencies=MAY_READ)
def show(request: Request, session: SessionDep, upload: int) -> Response:
    plain.keys(request)
    return render(request, upload_page.build(session, upload))


@router.post("/uploads/{upload:int}/check", dependencies=MAY_UPLOAD)
def check(request: Request, session: SessionDep, upload: int) -> Response:
    """Have the files read and checked. What takes longer than a moment is watched on a page."""
    require_checkable(uploads.find(session, upload))
    session.rollback()
    job, state = _set_to_work(request, "check", {"upload": upload})
    step = "problems" if state == "done" else f"checking?job={job}"
    return redirect(f"/uploads/{upload}/{step}", status=303)


def _set_to_work(request: Request, kind: str, params: dict[str, Any]) -> tuple[int, str]:
    """The job, and its state after a moment."""
    jobs = request.app.state
    job = jobs.executor.submit(kind, params)
    end = time.monotonic() + A_MOMENT
    while (state := jobs.book.find(job).state) in ("queued", "running"):
        if time.monotonic() > end:
            break
        time.sleep(0.02)
    return job, state


@router.api_route("/uploads/{upload:int}/checking", methods=READ, dependencies=MAY_READ)
def show_checking(request: Request, session: SessionDep, upload: int) -> Response:
    job = _job(request, upload, plain.keys(request, "job")["job"])
    draft = uploads.find(session, upload)
    made = job.kind == "commit" and draft.edition is not None  # even if it was stopped too late
    if job.state != "done" and not made:
        return render(request, upload_checking.build(session, upload, job))
    found = f"/uploads/{upload}/problems"
    if job.kind == "foresee":
        found = _effect(upload, taking_of_job(json.loads(job.params)))
    if made:
        found = f"/c/{draft.collection}/{draft.edition}/contents"
    if asked_block(request):  # the page asks for itself while it waits: have it go on
        return Response(headers={"HX-Redirect": found})
    return redirect(found)


@router.post("/uploads/{upload:int}/checking/cancel", dependencies=MAY_UPLOAD)
def cancel_checking(request: Request, upload: int, form: FormDep) -> Response:
    job = _job(request, upload, text(form, "job"))
    request.app.state.book.cancel(job.id)
    return redirect(f"/uploads/{upload}/checking?job={job.id}", status=303)


def _job(request: Request, upload: int, number: str) -> Job:
    """The job that checks this upload or makes an edition of it. Raises: Missing."""
    if not (number.isascii() and number.isdigit()):
        raise Missing("job", number)
    found: Job = request.app.state.book.find(int(number))
    if json.loads(found.params).get("upload") != upload:
        raise Missing("job", number)
    return found


@router.api_route("/uploads/{upload:int}/problems", methods=READ, dependencies=MAY_READ)
@router.api_route("/uploads/{upload:int}/problems.{twin}", methods=READ, dependencies=MAY_READ)
def show_problems(
    request: Request, session: SessionDep, viewer: ViewerDep, upload: int, twin: str = ""
) -> Response:
    if not uploads.find(session, upload).report:
        raise Elsewhere(f"/uploads/{upload}/reading")
    if not twin:
        taking = taking_of(request.query_params.multi_items())
        shown = preview_upload(session, upload_id=upload, taking=taking, by=viewer)
        return render(request, upload_problems.build(session, upload, taking, shown))
    page = upload_problems.build(session, upload)
    return plain.show(request, lambda: page, tag_parts=(page,), twin=twin)


@router.post("/uploads/{upload:int}/files", dependencies=MAY_UPLOAD)
def correct_file(
    request: Request, session: SessionDep, viewer: ViewerDep, upload: int, form: FormDep
) -> Response:
    """A corrected file in place of one: a new draft, read and checked as the one before."""
    found = file(form, "file")
    if found is None:
        raise Refusal(
            422, "Not understood", "No file was chosen. Go back and choose the corrected file."
        )
    new = correct_upload(
        session,
        upload_id=upload,
        file=(text(form, "role"), *found),
        by=viewer,
        now=dt.datetime.now(dt.UTC),
        limit=_limit(request),
    )
    if new.basis is None:
        return redirect(f"/uploads/{new.id}/reading", status=303)
    return check(request, session, new.id)


@router.post("/uploads/{upload:int}/commit", dependencies=[needs(Right.COMMIT)])
def commit(
    request: Request, session: SessionDep, viewer: ViewerDep, upload: int, form: FormDep
) -> Response:
    """Make the edition; where choices were made that were not shown yet, show what they change.
    What takes long is worked on by a process of its own, and watched on a page."""
    sent = [(key, value) for key, value in form.multi_items() if isinstance(value, str)]
    taking = taking_of((key, value) for key, value in sent if key in CHOICES)
    if text(form, "do") == "look" or asked(taking) != text(form, "shown"):
        return _foresee(request, session, viewer, upload, taking)
    note, now = text(form, "note"), dt.datetime.now(dt.UTC)
    ready = require_ready(session, upload_id=upload, note=note, by=viewer)
    if takes_long(session, ready, taking):
        session.rollback()
        params = to_commit(upload, note=note, by=viewer, now=now, taking=taking)
        job, _ = _set_to_work(request, "commit", params)
        return redirect(f"/uploads/{upload}/checking?job={job}", status=303)
    edition = commit_upload(session, upload_id=upload, note=note, by=viewer, now=now, taking=taking)
    return redirect(f"/c/{ready.upload.collection}/{edition.number}/contents", status=303)


def _foresee(
    request: Request, session: Session, viewer: Viewer, upload: int, taking: Taking
) -> Response:
    """Have it worked out what these choices would change, unless that is known."""
    place = _effect(upload, taking)
    try:
        require_sound(uploads.find(session, upload))
    except Refused:  # the list of problems says why
        return redirect(place, status=303)
    if preview_upload(session, upload_id=upload, taking=taking, by=viewer) is None:
        session.rollback()
        params = to_foresee(upload, by=viewer, taking=taking)
        job, state = _set_to_work(request, "foresee", params)
        if state != "done":
            place = f"/uploads/{upload}/checking?job={job}"
    return redirect(place, status=303)


def _effect(upload: int, taking: Taking) -> str:
    """Where it stands what taking this of the upload would change."""
    return f"/uploads/{upload}/problems?{asked(taking)}".rstrip("?") + "#effect"


@router.post("/uploads/{upload:int}/discard", dependencies=MAY_UPLOAD)
def discard(session: SessionDep, viewer: ViewerDep, upload: int, form: FormDep) -> Response:
    personal = text(form, "personal") == "yes"
    if not discard_upload(session, upload_id=upload, by=viewer, personal=personal) and personal:
        raise Refusal(
            409,
            "Not done",
            "The draft was discarded, but somebody was reading, so that a copy may stand in the "
            "database’s log of writes. Erase the bytes of any upload, or discard another draft, "
            "and it goes with them.",
        )
    return redirect("/uploads", status=303)


@router.post("/uploads/{upload:int}/erase", dependencies=[needs(Right.ADMINISTER)])
def erase(session: SessionDep, viewer: ViewerDep, upload: int, form: FormDep) -> Response:
    now, why = dt.datetime.now(dt.UTC), text(form, "why")
    if not erase_bytes(session, upload_id=upload, why=why, by=viewer, now=now).gone:
        raise Refusal(
            409,
            "Not done",
            "The bytes were erased from the upload, but somebody was reading, so that a copy may "
            "stand in the database’s log of writes. Go back and send it again.",
        )
    return redirect(f"/uploads/{upload}", status=303)


def _limit(request: Request) -> int:
    return int(request.app.state.config.upload_limit)
