"""Where files come in: /uploads/new, and POST to /uploads."""

import datetime as dt

from fastapi import APIRouter, Request, Response

from server.accounts.viewer import Right, Viewer
from server.actions.create_collection import create_collection
from server.actions.receive_upload import File, receive_upload
from server.intake.mapping import EVERY_ROLE
from server.intake.recognising.kinds import sorted_out
from server.pages import upload_new
from server.routes import plain
from server.routes.asking import SessionDep, ViewerDep, needs
from server.routes.forms import FormDep, file, files, text
from server.routes.small_tables import typed
from server.sentences import reading
from server.sentences.text import _
from server.store.connect import Session
from server.web.problem import Refusal
from server.web.render import READ, redirect, render

router = APIRouter()
PASTED = "pasted.tsv"


@router.api_route("/uploads/new", methods=READ, dependencies=[needs(Right.READ)])
def choose(request: Request, session: SessionDep) -> Response:
    chosen = plain.keys(request, "collection")["collection"]
    limit = request.app.state.config.upload_limit
    return render(request, upload_new.build(session, chosen, limit=limit))


@router.post("/uploads", dependencies=[needs(Right.UPLOAD)])
def receive(request: Request, session: SessionDep, viewer: ViewerDep, form: FormDep) -> Response:
    """Keep the files as a draft, each by what it is said to hold or seems to; a new collection is
    opened for them first."""
    found = _files(form)
    now = dt.datetime.now(dt.UTC)
    code = text(form, "collection") or _opened(session, form, viewer, now)
    upload = receive_upload(
        session,
        collection=code,
        files=found,
        by=viewer,
        now=now,
        limit=int(request.app.state.config.upload_limit),
    )
    return redirect(f"/uploads/{upload.id}/reading", status=303)


def _files(form: FormDep) -> list[File]:
    """Those with a kind stated, and the rest sorted out. Refusal where none was chosen, or where
    several hold the same."""
    named = [(role, *found) for role in EVERY_ROLE if (found := file(form, role)) is not None]
    roles = {role for role, _, _ in named}
    named += [table for table in typed(form) if table[0] not in roles]
    rest = files(form, "files")
    pasted = form.get("pasted", "")
    if isinstance(pasted, str) and pasted.strip():  # a tab before the first heading must stay
        rest.append((PASTED, pasted.strip("\r\n").encode()))
    if not named and not rest:
        raise Refusal(
            422,
            "Not understood",
            "No file was chosen. Go back and choose a file of deaths and one of population, or one "
            "that holds both; or paste a table.",
        )
    known = sorted_out(rest, [role for role, _, _ in named])
    if known.twice:
        role, name = known.twice[0]
        raise Refusal(
            422,
            "Not understood",
            "{name} seems to hold the same as another file: {role}. An upload has one file of each "
            "kind. Go back and say which file holds what, join the two, or upload one after the "
            "other.",
            name=name,
            role=reading.role(role) if role else _("nothing that can be told"),
        )
    return [*named, *known.files]


def _opened(session: Session, form: FormDep, viewer: Viewer, now: dt.datetime) -> str:
    """The code of the new collection that the form describes."""
    return create_collection(
        session,
        code=text(form, "code"),
        name=text(form, "name"),
        owner=text(form, "owner"),
        by=viewer,
        now=now,
    ).code
