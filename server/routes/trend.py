"""Which way is it going? /c/{collection}/{edition}/trend and its twins."""

from fastapi import APIRouter, Request, Response

from server.accounts.viewer import Right
from server.pages import trend
from server.results.loading import NotInEdition, holdings
from server.results.questions import TrendQuestion
from server.routes.asking import SessionDep, answer, ask, needs
from server.sentences.text import _
from server.store.connect import Session
from server.store.heading import Heading
from server.web.render import READ

router = APIRouter(dependencies=[needs(Right.READ)])

VIEW = TrendQuestion.view


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
    asked = ask(request, session, TrendQuestion, collection, edition, twin=twin, complete=completed)
    return answer(request, asked, lambda: trend.build(session, asked.heading, asked.question))


def completed(session: Session, heading: Heading, question: TrendQuestion) -> TrendQuestion:
    """Areas, sexes and years that were not spelled, from what the edition holds. NotInEdition."""
    if question.areas and question.sexes and question.first and question.last:
        return question
    held = holdings(session, heading.collection.code, heading.edition.number)
    if not held.periods:
        raise NotInEdition(_("This edition holds no years; there is nothing to follow."))
    return question.completed(
        areas=[area.code for area in held.areas], sexes=held.sexes, periods=held.periods
    )
