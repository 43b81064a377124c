"""Which way is it going? /c/{collection}/{edition}/trend and its twins."""

from server.pages import trend
from server.results.holdings import NotInEdition, holdings
from server.results.questions import TrendQuestion
from server.routes.asking import pinned
from server.sentences.text import _
from server.store.connect import Session
from server.store.heading import Heading


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


router = pinned(TrendQuestion, trend.build, complete=completed)
