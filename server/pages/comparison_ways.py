"""Where the two sides of a comparison can be read by themselves, what else they can be set
against, and what has become of the editions they stand in."""

from dataclasses import dataclass, replace

from engine.standards.remaining_years import REFERENCES
from server.pages import cause_choices, what_would_change
from server.pages import comparison_tables as tables
from server.pages.choices import Grouped, Offer, Options, offer
from server.pages.choices import indicators as offered
from server.pages.page import Notice
from server.results.compared import Comparison, Side
from server.results.questions import (
    OVERLAPS,
    ComparisonQuestion,
    PopulationYear,
    PopulationYearQuestion,
    address,
)
from server.sentences import beside as say
from server.sentences import names
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _


@dataclass(frozen=True, slots=True)
class Choice:
    """A plain form that leads to another pair under the same settings."""

    action: str
    offer: Offer
    offer_that: Offer  # of the collection that the other side stands in
    this: PopulationYear
    that: PopulationYear
    of: str
    indicators: Grouped
    overlap: str
    overlaps: Options
    standard: str
    standards: Options
    that_collection: str
    that_edition: str
    causes: tuple[cause_choices.CauseLine, ...]  # empty where the edition has none
    figures: str
    settings: str


def choice(found: Comparison) -> Choice:
    heading, question, years = found.heading, found.question, found.settings.years
    elsewhere = found.other if found.kind == "elsewhere" else None
    own = offer(found.holdings, years)
    return Choice(
        action=f"/c/{heading.collection.code}/{heading.edition.number}/{question.view}",
        offer=own,
        offer_that=offer(elsewhere.holdings, years) if elsewhere else own,
        this=question.this,
        that=question.that,
        of=question.of,
        indicators=offered(question.of, compared=True),
        overlap=question.overlap if found.overlap else OVERLAPS[1],
        overlaps=(
            ("rest", _("against the rest of it")),
            ("shared", _("against the whole, shared deaths counted once")),
        ),
        standard=question.standard,
        standards=(
            (
                "",
                _("none"),
            ),
            *((key, _(one.label)) for key, one in REFERENCES.items()),
        ),
        that_collection=question.that_collection,
        that_edition=str(question.that_edition) if elsewhere else "",
        figures=question.figures,
        settings=question.settings,
        causes=cause_choices.lines(question.causes),
    )


def place(found: Comparison) -> Sentence:
    """The two in the locator, each linked to its own page."""
    both = tables.pair(found)
    return phrase(
        _("{this} against {that}"),
        this=_linked(found, found.this, both.this.whole),
        that=_linked(found, found.that, both.that.whole),
    )


def _linked(found: Comparison, side: Side, words: str) -> Piece:
    """A printed table has no page; that of a rest is the page of its whole."""
    if side.place.standard:
        return Piece(words)
    question = PopulationYearQuestion(side.of, found.question.figures, found.question.settings)
    heading = side.place.heading
    return Piece(words, address(heading.collection.code, heading.edition.number, question))


def further(found: Comparison) -> tuple[Sentence, ...]:
    """Both sides by themselves, the same from the other side, and what else there is to set this
    one against."""
    ways = []
    for side in (found.this, found.that):
        if side is found.that and (found.same or side.place.rest or side.place.standard):
            continue
        who = names.first_capital(tables.named(found, side).whole)
        ways.append(
            phrase(
                _("{who}: the life table and its pictures"),
                who=_linked(found, side, who),
            )
        )
    return (*ways, *_changed(found), *_turned(found), *_overlap(found), *_revised(found))


def _changed(found: Comparison) -> tuple[Sentence, ...]:
    """What would change the figures of this side."""
    if found.this.place.rest:
        return ()
    asked = found.question
    of = (found.heading, asked.this, asked.figures, asked.settings)
    return (what_would_change.ways(*of, indicator=asked.of),)


def _turned(found: Comparison) -> tuple[Sentence, ...]:
    question, here = found.question, found.heading
    where = found.other.heading if found.other else here
    if found.kind == "standard":
        return ()
    turned = question.exchanged()
    if found.kind == "elsewhere":
        code, number = here.collection.code, here.edition.number
        turned = replace(turned, that_collection=code, that_edition=number)
    elif found.kind == "revision":
        turned = replace(turned, that_edition=here.edition.number)
    exchange = Piece(
        _("Exchange the two"), address(where.collection.code, where.edition.number, turned)
    )
    return (phrase(_("{exchange}: the same from the other side"), exchange=exchange),)


def _overlap(found: Comparison) -> tuple[Sentence, ...]:
    """From the rest to the whole and back, where one side lies in the other."""
    if found.kind == "rest":
        other, words = OVERLAPS[0], _("Against the whole, shared deaths counted once")
    elif found.kind == "plain" and found.overlap and found.this.of.sex == found.that.of.sex:
        other, words = OVERLAPS[1], _("Against the rest of it")
    else:
        return ()
    turned = replace(found.question, overlap=other).simplified()
    if turned == found.question or found.same:
        return ()
    return ((_link(found, words, turned),),)


def _revised(found: Comparison) -> tuple[Sentence, ...]:
    """What a revision did to this side, and how far it is from a printed table."""
    if found.kind not in ("plain", "rest"):
        return ()
    question, base, ways = found.question, found.heading.edition.base, []
    alone = replace(question, that=question.this, overlap=OVERLAPS[0])
    who = names.first_capital(
        tables.named(found, found.this).whole
        if found.this.place.rest is None
        else tables.plain_name(found, question.this)
    )
    if base:
        before = _link(
            found, _("against edition {number}", number=base), replace(alone, that_edition=base)
        )
        ways.append(before)
    for key, one in REFERENCES.items():
        words = _("against the {table}", table=_(one.label))
        ways.append(_link(found, words, replace(alone, standard=key)))
    return (
        (phrase(_("{who} {ways}"), who=who, ways=ways[0]),)
        if len(ways) == 1
        else (phrase(_("{who} {first}, or {second}"), who=who, first=ways[0], second=ways[1]),)
    )


def _link(found: Comparison, words: str, question: ComparisonQuestion) -> Piece:
    heading = found.heading
    return Piece(words, address(heading.collection.code, heading.edition.number, question))


def notices(found: Comparison) -> tuple[Notice, ...]:
    """What has become of the other edition: withdrawn, or a newer one stands."""
    if found.other is None:
        return ()
    heading, out = found.other.heading, []
    collection, number = heading.collection.name, heading.edition.number
    if heading.edition.withdrawn:
        event = heading.edition.events[-1]
        text = say.other_withdrawn(collection, number, event.at, event.note)
        out.append(Notice(_("Withdrawn"), text))
    own = (found.heading.edition.number, number) if found.kind == "revision" else (number,)
    if heading.newest is not None and heading.newest > max(own):
        turned = replace(found.question, that_edition=heading.newest)
        words = _("Edition {number}", number=heading.newest)
        text = say.other_superseded(collection, number, _link(found, words, turned))
        out.append(Notice(_("A newer edition stands"), text))
    return tuple(out)
