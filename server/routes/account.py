"""Why does this figure read differently? /c/{collection}/{edition}/account and its twins."""

from dataclasses import replace

from server.pages import account
from server.results.account import AccountQuestion
from server.routes.asking import pinned
from server.store.connect import Session
from server.store.heading import Heading


def completed(session: Session, heading: Heading, question: AccountQuestion) -> AccountQuestion:
    """Since the edition it was built on, where none is named; of the first, only settings can
    differ."""
    number = heading.edition.base or heading.edition.number
    return question if question.since else replace(question, since=number)


router = pinned(AccountQuestion, account.build, complete=completed)
