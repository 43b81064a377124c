"""What lies between these two? /c/{collection}/{edition}/comparison and its twins."""

from fastapi import APIRouter, Request, Response

from server.accounts.viewer import Right
from server.pages import comparison
from server.results.questions import ComparisonQuestion
from server.routes.asking import SessionDep, answer, ask, needs
from server.web.render import READ

router = APIRouter(dependencies=[needs(Right.READ)])

VIEW = ComparisonQuestion.view


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
    asked = ask(request, session, ComparisonQuestion, collection, edition, twin=twin)
    return answer(request, asked, lambda: comparison.build(session, asked.heading, asked.question))
