"""The page of an address or a form that could not be answered: what is so, and what to do."""

from dataclasses import dataclass
from typing import ClassVar

from server.pages.page import Frame, Notice, Page
from server.sentences.pieces import Piece
from server.sentences.text import _
from server.web.problem import Problem


@dataclass(frozen=True, slots=True, kw_only=True)
class ErrorPage(Page):
    """A problem, in the anatomy of every page."""

    template: ClassVar[str] = "error/page.html"
    asked: str
    reference: str  # by which the line in the log is found
    errors: tuple[str, ...]
    alert: Notice  # the same in a line, beside a page that stays


def build(problem: Problem) -> ErrorPage:
    return ErrorPage(
        frame=Frame(
            title=problem.title,
            address=problem.asked,
            locator=(Piece(_("Collections"), "/collections"),),
        ),
        answer=(Piece(problem.detail),),
        asked=problem.asked,
        reference=_(
            "Problem {status}, request {request}.",
            status=problem.status,
            request=problem.request_id,
        ),
        errors=problem.errors,
        alert=Notice(problem.title, (Piece(" ".join((problem.detail, *problem.errors))),)),
    )
