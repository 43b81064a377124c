"""Two population-years set against one another: what is loaded for it, and from where."""

from dataclasses import replace

import numpy as np

from engine import indicators
from engine import settings as named
from engine.settings import Settings
from server.results import sides
from server.results.causes import CauseChoice
from server.results.compared import Asked, Comparison, Side, compared, shared_grid
from server.results.holdings import Holdings, holdings
from server.results.loading import Beside, Found, Loaded, load
from server.results.protecting import protected
from server.results.questions import ComparisonQuestion, PopulationYear
from server.results.revision import Moved, moved
from server.store.connect import Session
from server.store.heading import Heading

__all__ = ["Comparison", "Side", "comparison"]


def comparison(session: Session, heading: Heading, question: ComparisonQuestion) -> Comparison:
    """Load both, bring them to one grid, take the difference apart. NotInEdition."""
    collection, number = heading.collection.code, heading.edition.number
    settings = named.find(question.settings)
    held = holdings(session, collection, number)
    other = sides.elsewhere(session, heading, question)
    held.require(question.this)
    if other is None and not question.standard:
        held.require(question.that)
    beside = Beside.of(settings, held.areas, indicators.find(question.of))
    with_causes = replace(beside, causes=_causes(question, heading))
    asked = sides.wanted(question, held, settings)
    years = _years_between(question, held, settings)
    loaded = load(
        session, collection, number, [*asked, *years], with_causes, figures=question.figures
    )
    fixed = sides.fixed_side(session, other, question, settings, with_causes)
    pair = sides.pair(question, held, loaded, fixed, settings)
    if pair is None:
        lacking = next(one for one in (question.this, question.that) if one not in loaded)
        raise held.lacks(lacking, settings.years)
    between = tuple(loaded[year] for year in years if year in loaded)
    return compared(
        Asked(heading, held, other, question, settings),
        pair,
        between if len(between) == len(years) else (),
        _moved(session, heading, question, held, fixed, settings, beside),
    )


def _causes(question: ComparisonQuestion, heading: Heading) -> CauseChoice | None:
    """How causes are shown; None where the edition has none, or a printed table has."""
    if question.standard:
        return None
    return CauseChoice.spelled(question.causes, held=heading.causes)


def _moved(
    session: Session,
    heading: Heading,
    question: ComparisonQuestion,
    held: Holdings,
    fixed: Loaded | None,
    settings: Settings,
    beside: Beside,
) -> Moved | None:
    """By how much the newest edition moves the difference asked for; not beside an earlier edition
    of the same, which is what it is compared with."""
    if question.that_edition and not question.that_collection:
        return None

    def headline(newer: Found) -> float:
        pair = sides.pair(question, held, newer, fixed, settings)
        if pair is None:
            return np.nan
        grid = shared_grid(pair)
        this, that = (one.panel.regroup(grid) for one in (pair.this, pair.that))
        of = indicators.find(question.of)
        difference = indicators.difference(of, this, that, settings)
        return float(protected(of.key, difference, pair.this, pair.that).value)

    asked = sides.wanted(question, held, settings)
    return moved(session, heading, asked, beside, headline, figures=question.figures)


def _years_between(
    question: ComparisonQuestion, held: Holdings, settings: Settings
) -> tuple[PopulationYear, ...]:
    """All years from that to this, where there are some between two years of one area and sex, the
    edition holds them and no break parts them; not of years added up, which overlap."""
    this, that = question.this, question.that
    step = 1 if this.period > that.period else -1
    years = [
        replace(that, period=f"{year:04}")
        for year in range(int(that.period), int(this.period) + step, step)
    ]
    own = not (question.standard or question.that_edition)
    one_people = own and (this.area, this.sex) == (that.area, that.sex)
    whole = one_people and settings.years == 1 and all(year in held.status for year in years)
    parted = held.parted(this.period, that.period, this.area)
    return tuple(years) if whole and len(years) > 2 and not parted else ()
