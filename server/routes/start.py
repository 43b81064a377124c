"""The first page, the templates to fill in, and the demonstration."""

import datetime as dt

from fastapi import APIRouter, Request, Response

from server.accounts.viewer import Right
from server.intake import templates
from server.pages import start
from server.routes.asking import NoSuchPage, SessionDep, needs
from server.routes.plain import keys
from server.sentences.text import _
from server.store import collections
from server.web.render import READ, redirect, respond

router = APIRouter()


@router.api_route("/", methods=READ, dependencies=[needs(Right.READ)])
def begin(request: Request, session: SessionDep) -> Response:
    """What to do next; where there are collections, their list."""
    keys(request)
    if collections.all_collections(session):
        return redirect("/collections")
    return respond(request, start.build, tag_parts=())


@router.post("/demonstration", dependencies=[needs(Right.COMMIT)])
def load_demonstration(request: Request, session: SessionDep) -> Response:
    """Load what of it is not there."""
    demonstration = request.app.state.demonstration
    there = [one.code for one in collections.all_collections(session)]
    demonstration.build(session, now=dt.datetime.now(dt.UTC), there=there)
    return redirect(f"/c/{demonstration.CODE}", status=303)


@router.api_route("/templates/{name}.csv", methods=READ, dependencies=[needs(Right.READ)])
def template(request: Request, name: str) -> Response:
    """A file to fill in."""
    keys(request)
    if name not in templates.TEMPLATES:
        raise NoSuchPage(
            _(
                "There is no template {name}.csv; there are {known}.",
                name=name,
                known=", ".join(f"{one}.csv" for one in templates.TEMPLATES),
            )
        )
    return Response(
        templates.TEMPLATES[name],
        media_type="text/csv; charset=utf-8",
        headers={"Content-Disposition": f'attachment; filename="{name}.csv"'},
    )
