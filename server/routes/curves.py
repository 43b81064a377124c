"""Which curve lies behind the death rates? /c/{collection}/{edition}/curves and its twins."""

from fastapi import APIRouter, Request, Response

from server.accounts.viewer import Right
from server.pages import curves
from server.results.questions import CurvesQuestion
from server.routes.asking import SessionDep, answer, ask, needs
from server.web.render import READ

router = APIRouter(dependencies=[needs(Right.READ)])

VIEW = CurvesQuestion.view


@router.api_route(f"/c/{{collection}}/{{edition:int}}/{VIEW}", methods=READ)
@router.api_route(f"/c/{{collection}}/{{edition:int}}/{VIEW}.{{twin}}", methods=READ)
@router.api_route(f"/c/{{collection}}/{VIEW}", methods=READ)
@router.api_route(f"/c/{{collection}}/{VIEW}.{{twin}}", methods=READ)
def show(
    request: Request,
    session: SessionDep,
    collection: str,
    edition: int | None = None,
    twin: str = "",
) -> Response:
    asked = ask(request, session, CurvesQuestion, collection, edition, twin=twin)
    return answer(request, asked, lambda: curves.build(session, asked.heading, asked.question))
