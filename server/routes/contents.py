"""Collections, their editions, and what an edition holds: /collections, /c/{collection} ..."""

import datetime as dt

from fastapi import APIRouter, Request, Response

from server.accounts.viewer import Right
from server.actions.reinstate_edition import reinstate_edition
from server.actions.withdraw_edition import withdraw_edition
from server.pages import collections as collections_page
from server.pages import contents as contents_page
from server.pages import editions as editions_page
from server.results.contents import ContentsQuestion
from server.routes.asking import Elsewhere, SessionDep, ViewerDep, answer, ask, code, needs
from server.routes.forms import FormDep, text
from server.routes.plain import show
from server.store import collections
from server.store.editions import newest_standing
from server.web.render import READ, redirect

router = APIRouter()
VIEW = ContentsQuestion.view


@router.api_route("/collections", methods=READ, dependencies=[needs(Right.READ)])
@router.api_route("/collections.{twin}", methods=READ, dependencies=[needs(Right.READ)])
def show_collections(request: Request, session: SessionDep, twin: str = "") -> Response:
    known = collections.all_collections(session)
    return show(request, lambda: collections_page.build(session), tag_parts=known, twin=twin)


@router.api_route("/c/{collection}/editions", methods=READ, dependencies=[needs(Right.READ)])
@router.api_route("/c/{collection}/editions.{twin}", methods=READ, dependencies=[needs(Right.READ)])
def show_editions(
    request: Request, session: SessionDep, collection: str, twin: str = ""
) -> Response:
    known = collections.find(session, code(collection))
    return show(
        request, lambda: editions_page.build(session, known.code), tag_parts=(known,), twin=twin
    )


@router.api_route("/c/{collection}", methods=READ, dependencies=[needs(Right.READ)])
@router.api_route(f"/c/{{collection}}/{VIEW}", methods=READ, dependencies=[needs(Right.READ)])
@router.api_route(
    f"/c/{{collection}}/{VIEW}.{{twin}}", methods=READ, dependencies=[needs(Right.READ)]
)
@router.api_route(
    f"/c/{{collection}}/{{edition:int}}/{VIEW}", methods=READ, dependencies=[needs(Right.READ)]
)
@router.api_route(
    f"/c/{{collection}}/{{edition:int}}/{VIEW}.{{twin}}",
    methods=READ,
    dependencies=[needs(Right.READ)],
)
def show_contents(
    request: Request,
    session: SessionDep,
    collection: str,
    edition: int | None = None,
    twin: str = "",
) -> Response:
    if edition is None and not twin and newest_standing(session, code(collection)) is None:
        known = collections.find(session, collection)
        raise Elsewhere(f"/c/{known.code}/editions")
    asked = ask(request, session, ContentsQuestion, collection, edition, twin=twin)
    return answer(
        request, asked, lambda: contents_page.build(session, asked.heading, asked.question)
    )


@router.post("/c/{collection}/{edition:int}/withdraw", dependencies=[needs(Right.WITHDRAW)])
def withdraw(
    session: SessionDep, viewer: ViewerDep, collection: str, edition: int, form: FormDep
) -> Response:
    now = dt.datetime.now(dt.UTC)
    withdraw_edition(
        session, collection=collection, number=edition, note=text(form, "note"), by=viewer, now=now
    )
    return redirect(f"/c/{collection}/{edition}/{VIEW}", status=303)


@router.post("/c/{collection}/{edition:int}/reinstate", dependencies=[needs(Right.WITHDRAW)])
def reinstate(
    session: SessionDep, viewer: ViewerDep, collection: str, edition: int, form: FormDep
) -> Response:
    now = dt.datetime.now(dt.UTC)
    reinstate_edition(
        session, collection=collection, number=edition, note=text(form, "note"), by=viewer, now=now
    )
    return redirect(f"/c/{collection}/{edition}/{VIEW}", status=303)
