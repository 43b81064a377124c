"""The page of an address or a form that could not be answered: what is so, and what to do."""

import re
from dataclasses import dataclass
from typing import ClassVar

from server.pages.page import Frame, Notice, Page
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _
from server.web.problem import Problem

_OF_EDITION = re.compile(r"(/c/[^/?]+)/[^/?]+(/.+)")
_OF_UPLOAD = re.compile(r"(/uploads/\d+)/(reading|files|commit)")


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
        lead=_way_on(problem),
        asked=problem.asked,
        reference=_(
            "Problem {status}, request {request}.",
            status=problem.status,
            request=problem.request_id,
        ),
        errors=problem.errors,
        alert=Notice(_("Not shown"), _beside_what_stays(problem)),
    )


def _way_on(problem: Problem) -> tuple[Sentence, ...]:
    """From a page of an edition that is not there, to the same page of the edition that stands;
    from a form, back to it."""
    if problem.asked == "/uploads":
        return (phrase(_("Back to {form}."), form=Piece(_("the files"), "/uploads/new")),)
    if (found := _OF_UPLOAD.fullmatch(problem.asked)) is not None:
        place, step = found.groups()
        form = (
            Piece(_("the mapping"), f"{place}/reading")
            if step == "reading"
            else Piece(_("what the checks found"), f"{place}/problems")
        )
        return (phrase(_("Back to {form}."), form=form),)
    found = _OF_EDITION.fullmatch(problem.asked)
    if problem.status != 404 or found is None:
        return ()
    collection, rest = found.groups()
    return (
        phrase(
            _("The same page may stand in {newest}; {collection} says which editions there are."),
            newest=Piece(_("the newest edition"), f"{collection}{rest}"),
            collection=Piece(_("the collection"), collection),
        ),
    )


def _beside_what_stays(problem: Problem) -> Sentence:
    """The notice over a page of which nothing was replaced."""
    return phrase(
        "{said} {stays}",
        said=" ".join((problem.detail, *problem.errors)),
        stays=_("What stands below is as it was before."),
    )
