"""Look up a printed table: /reproduce. The file is read and forgotten."""

from fastapi import APIRouter, Request, Response

from server.accounts.viewer import Right
from server.pages import reproduce
from server.pages.reproduce import Asked
from server.results.reproducing import MOST
from server.routes import plain
from server.routes.asking import TWINS, SessionDep, needs
from server.routes.forms import FormDep, file, text
from server.store import collections
from server.web import render as web
from server.web.problem import Refusal

router = APIRouter()
BESIDE = ("collection", "edition", "settings", "of", "address")


@router.api_route("/reproduce", methods=web.READ, dependencies=[needs(Right.READ)])
def ask(request: Request, session: SessionDep) -> Response:
    known = collections.all_collections(session)
    return plain.show(request, lambda: reproduce.form(session), tag_parts=known)


@router.post("/reproduce", dependencies=[needs(Right.UPLOAD)])
def look_up(request: Request, session: SessionDep, form: FormDep) -> Response:
    """The page, or with `as` a twin of it."""
    found = file(form, "file")
    if found is None:
        raise Refusal(422, "Not understood", "No file was chosen. Go back and choose the table.")
    asked = Asked(
        **{
            name: text(form, name)
            for name in ("collection", "edition", "settings", "of", "address")
        }
    )
    page = reproduce.build(session, *found, asked, most=MOST)
    twin = text(form, "as")
    if twin not in TWINS:
        return web.render(request, page)
    body = web.of(request).writers[twin](
        page, page.tables[0].key if page.tables else "", "looked-up"
    )
    return Response(body.content, media_type=body.media_type)
