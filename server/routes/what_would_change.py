"""What would change it? /c/{collection}/{edition}/what-if, gaps and exchange, and their twins."""

from dataclasses import replace
from typing import TypeVar

from server.pages import exchange, gaps, what_if
from server.results.causes import CauseChoice
from server.results.exchange import ExchangeQuestion
from server.results.gaps import GapsQuestion
from server.results.what_if_question import WhatIfQuestion
from server.routes.asking import pinned
from server.store.connect import Session
from server.store.heading import Heading

Asks = TypeVar("Asks", WhatIfQuestion, GapsQuestion, ExchangeQuestion)


def completed(_session: Session, heading: Heading, question: Asks) -> Asks:
    """How causes are shown, spelled where the edition has any."""
    return replace(question, causes=CauseChoice.spelled(question.causes, held=heading.causes))


ROUTERS = (
    pinned(WhatIfQuestion, what_if.build, complete=completed),
    pinned(GapsQuestion, gaps.build, complete=completed),
    pinned(ExchangeQuestion, exchange.build, complete=completed),
)
