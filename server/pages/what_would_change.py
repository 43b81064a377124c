"""From a page about a population-year to what would change its figures."""

from engine.indicators import INDICATORS
from server.pages import frames, provisional
from server.pages.page import Frame
from server.results.causes import CauseChoice
from server.results.exchange import Exchange, ExchangeQuestion
from server.results.gaps import Gaps, GapsQuestion
from server.results.questions import PopulationYear, PopulationYearQuestion, Question, address
from server.results.what_if_question import WhatIfQuestion
from server.sentences import names
from server.sentences.basis import Told, in_a_row
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.standing import Headline
from server.sentences.text import _
from server.store.connect import Session
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


def frame(found: Exchange | Gaps, title: str, place: str) -> Frame:
    """Of a page about life expectancy of one population; `title` has {who} and {year}, `place` the
    {who} that is linked."""
    heading, of, asked = found.heading, found.of, found.question
    headline = None
    if found.moved is not None:
        e0 = INDICATORS["e0"]
        headline = Headline(_(e0.label), e0.unit, float(found.e0.value), found.moved.value)
    own = PopulationYearQuestion(of, asked.figures, asked.settings)
    linked = address(heading.collection.code, heading.edition.number, own)
    who = _("{who} in {year}", who=names.population(of.sex, found.name), year=found.period)
    return frames.pinned(
        heading,
        asked,
        title=title.format(who=names.population_first(of.sex, found.name), year=found.period),
        place=phrase(place, who=Piece(who, linked)),
        figures=asked.figures,
        settings=asked.settings,
        notices=frames.notices(heading, asked, found.moved, headline),
    )


def moved_before(session: Session, found: Exchange | Gaps, *, any_: bool) -> Told:
    """How far provisional figures moved before, where any of these is provisional."""
    asked = found.question
    return provisional.caution(
        session, found.heading, found.holdings, asked.settings, asked.figures, any_=any_
    )
