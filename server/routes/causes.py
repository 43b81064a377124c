"""Of what do people die here? /c/{collection}/{edition}/causes and its twins."""

from server.pages import causes
from server.results.cause_figures import no_causes
from server.results.holdings import NotInEdition, holdings
from server.results.questions import CausesQuestion
from server.routes.asking import pinned
from server.store.connect import Session
from server.store.heading import Heading


def completed(session: Session, heading: Heading, question: CausesQuestion) -> CausesQuestion:
    """With the choices that were not spelled. NotInEdition where there are no causes."""
    if question.causes is not None:
        return question
    if not holdings(session, heading.collection.code, heading.edition.number).causes:
        raise NotInEdition(no_causes())
    return question.completed()


router = pinned(CausesQuestion, causes.build, complete=completed)
