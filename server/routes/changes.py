"""What did this edition change? /c/{collection}/{edition}/changes and its twins."""

from dataclasses import replace

from server.pages import changes
from server.results.changes import ChangesQuestion, default_since
from server.routes.asking import pinned
from server.store.connect import Session
from server.store.heading import Heading


def completed(session: Session, heading: Heading, question: ChangesQuestion) -> ChangesQuestion:
    """Since the edition it was built on, where none is named. NotInEdition."""
    if question.since:
        return question
    return replace(question, since=default_since(session, heading))


router = pinned(ChangesQuestion, changes.build, complete=completed)
