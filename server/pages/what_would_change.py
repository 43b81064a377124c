"""From a page about a population-year to what would change its figures."""

from server.results.causes import CauseChoice
from server.results.exchange import ExchangeQuestion
from server.results.gaps import GapsQuestion
from server.results.questions import PopulationYear, PopulationYearQuestion, Question, address
from server.results.what_if_question import WhatIfQuestion
from server.sentences.basis import in_a_row
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _
from server.store.heading import Heading


def ways(
    heading: Heading, of: PopulationYear, figures: str, settings: str, *, indicator: str = "e0"
) -> Sentence:
    """What would change it? Other death rates, gaps that could close, deaths for a month."""
    causes = CauseChoice.spelled(None, held=heading.causes)
    own = (of, figures, settings, causes)
    asked: tuple[tuple[str, Question], ...] = (
        (
            _("other death rates"),
            WhatIfQuestion(of, indicator, causes=causes, figures=figures, settings=settings),
        ),
        (_("where closing the gap adds most"), GapsQuestion(*own)),
        (_("deaths to avoid for a month of life expectancy"), ExchangeQuestion(*own)),
    )
    links = [
        Piece(words, address(heading.collection.code, heading.edition.number, question))
        for words, question in asked
    ]
    return (*phrase(_("What would change it? ")), *in_a_row(links), Piece("."))


def back(
    heading: Heading,
    of: PopulationYear,
    figures: str,
    settings: str,
    *,
    but: type[Question],
    causes: CauseChoice | None,
) -> tuple[Sentence, ...]:
    """The life table, and the other two of the three pages."""
    own = (of, figures, settings, causes)
    asked: tuple[tuple[str, Question], ...] = (
        (_("The life table and its pictures"), PopulationYearQuestion(of, figures, settings)),
        (
            _("What would the figures be at other death rates?"),
            WhatIfQuestion(of, causes=causes, figures=figures, settings=settings),
        ),
        (_("Where closing the gap adds most"), GapsQuestion(*own)),
        (_("Deaths to avoid at each age for a month of life expectancy"), ExchangeQuestion(*own)),
    )
    return tuple(
        (Piece(words, address(heading.collection.code, heading.edition.number, question)),)
        for words, question in asked
        if type(question) is not but
    )
