"""Where the two sides of a comparison stand: one edition, two of them, two collections, or one of
them in a printed table."""

from dataclasses import dataclass, replace
from typing import Literal

from engine.settings import Settings
from engine.standards.reference_table import reference_panel
from engine.standards.remaining_years import REFERENCES
from server.results.causes import CauseChoice
from server.results.holdings import Holdings, holdings
from server.results.keys import BadValue
from server.results.loading import Beside, Found, Loaded, Shared, load, overlap
from server.results.questions import ComparisonQuestion, PopulationYear
from server.results.releasing import FULL
from server.results.rest import Rest, rest, rests
from server.sentences.text import _
from server.store import editions
from server.store.connect import Session
from server.store.heading import Heading, heading

Kind = Literal["plain", "rest", "revision", "elsewhere", "standard"]


@dataclass(frozen=True, slots=True)
class Elsewhere:
    """Where that side stands, if not in the edition of the address."""

    heading: Heading
    holdings: Holdings


@dataclass(frozen=True, slots=True)
class Pair:
    """The counts of both sides."""

    this: Loaded
    that: Loaded
    rest: Rest | None  # what one of them is
    whole: PopulationYear | None  # whose place the rest has taken
    overlap: Shared | None  # whose counts are part of both; None also where they are not held
    shared: Loaded | None
    no_rest: bool = False  # asked for, but the whole counts fewer than its part


def completed(session: Session, known: Heading, question: ComparisonQuestion) -> ComparisonQuestion:
    """What the address leaves open: the newest edition of another collection that stands, and how
    causes are shown where the edition has a list of them. BadValue where another edition is set
    beside another area, sex or year."""
    causes = CauseChoice.spelled(question.causes, held=known.causes)
    question = replace(question, causes=causes)
    if question.that_collection in ("", known.collection.code):
        number = question.that_edition
        number = 0 if number == known.edition.number else number
        if number and question.this != question.that:
            raise BadValue(
                _(
                    "Another edition of a collection is set beside the same area, sex and year, so"
                    " that what was revised is seen. Choose {code} on both sides, or leave out"
                    " “that_edition”.",
                    code=question.this.code,
                )
            )
        return replace(question, that_collection="", that_edition=number).simplified()
    if question.that_edition:
        return question
    newest = editions.newest_standing(session, question.that_collection)
    return replace(question, that_edition=newest.number if newest else 1)


def headings(session: Session, known: Heading, question: ComparisonQuestion) -> tuple[Heading, ...]:
    """The heading of the other edition that the page rests on, which is part of its tag: one
    statement, and only where there is one. Missing, for the collection or the edition."""
    if not question.that_edition:
        return ()
    code = question.that_collection or known.collection.code
    found = heading(session, code, question.that_edition)
    return (found if question.figures == FULL else found.released,)


def elsewhere(session: Session, known: Heading, question: ComparisonQuestion) -> Elsewhere | None:
    """Where that side stands, if not in the edition of the address. NotInEdition."""
    found = headings(session, known, question)
    if not found:
        return None
    code, number = found[0].collection.code, found[0].edition.number
    held = holdings(session, code, number)
    held.require(question.that)
    return Elsewhere(found[0], held)


def kind(question: ComparisonQuestion, rest_of: Rest | None) -> Kind:
    if question.standard:
        return "standard"
    if question.that_collection:
        return "elsewhere"
    if question.that_edition:
        return "revision"
    return "rest" if rest_of else "plain"


def wanted(
    question: ComparisonQuestion, held: Holdings, settings: Settings
) -> tuple[PopulationYear | Shared, ...]:
    """What of the edition of the address both sides are made of."""
    if question.standard or question.that_edition:
        return (question.this,)
    both = overlap(question.this, question.that, held.areas, settings.years)
    needed = [one for found in rests(question, held, settings).values() for one in found.needed]
    return (question.this, question.that, *([both] if both else []), *needed)


def pair(
    question: ComparisonQuestion,
    held: Holdings,
    found: Found,
    fixed: Loaded | None,
    settings: Settings,
) -> Pair | None:
    """Both sides from what was loaded of the edition; `fixed` is that side where it stands
    elsewhere. None where one is not held."""
    this = found.get(question.this)
    that = fixed or found.get(question.that)
    if this is None or that is None:
        return None
    if fixed is not None:
        return Pair(this, that, None, None, None, None)
    both = overlap(question.this, question.that, held.areas, settings.years)
    shared = found.get(both) if both else None
    asked = rests(question, held, settings)
    for whole, of in asked.items():
        left = rest(of, found)
        if left is not None:
            sides = (left, that) if whole == question.this else (this, left)
            return Pair(*sides, of, whole, None, None)
    return Pair(this, that, None, None, both if shared else None, shared, bool(asked))


def fixed_side(
    session: Session,
    other: Elsewhere | None,
    question: ComparisonQuestion,
    settings: Settings,
    beside: Beside,
) -> Loaded | None:
    """That side where it stands in no edition, or in another; one statement at most. NotInEdition
    where that edition lacks one of the years to be added up."""
    if question.standard:
        return Loaded(reference_panel(REFERENCES[question.standard], settings), "final")
    if other is None:
        return None
    code, number = other.heading.collection.code, other.heading.edition.number
    parents = {area.code: area.parent for area in other.holdings.areas if area.parent}
    if not other.holdings.causes:
        beside = replace(beside, causes=None)
    found = load(
        session,
        code,
        number,
        [question.that],
        replace(beside, parents=parents),
        figures=question.figures,
    )
    if question.that not in found:
        raise other.holdings.lacks(question.that, settings.years)
    return found[question.that]
