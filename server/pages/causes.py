"""Of what do people die here? One area, sex and year, by cause of death."""

from dataclasses import dataclass, replace
from typing import ClassVar

import numpy as np

from engine.causes.number import CauseNumber
from engine.estimates import Reason
from engine.indicators import INDICATORS
from server.charts.chart import Chart
from server.exports.table import Table
from server.pages import cause_choices, frames, provisional
from server.pages import causes_charts as charts
from server.pages import causes_tables as tables
from server.pages.choices import Choice as Another
from server.pages.choices import Options, offer
from server.pages.page import Caution, Frame, Page
from server.pages.statuses import marked, marks
from server.pages.withholding import caution, charts_given, tables_given
from server.results.cause_figures import NUMBERS, CauseFigures, cause_figures, held_by_cause
from server.results.causes import CauseChoice
from server.results.holdings import Holdings
from server.results.questions import (
    CausesQuestion,
    ComparisonQuestion,
    PopulationYear,
    PopulationYearQuestion,
    address,
)
from server.sentences import basis, care, cause_methods, names, sharing
from server.sentences import causes as say
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.reasons import reason
from server.sentences.standing import Headline
from server.sentences.text import _
from server.store.connect import Session
from server.store.heading import Heading

TOLD = 3  # causes named in the answer
LAW = "almanac-1-kannisto"  # what to ask for where the open group is too large


@dataclass(frozen=True, slots=True)
class Choice:
    """A plain form: another population-year, other choices of causes, the one followed through the
    years, and those counted as avoidable."""

    another: Another
    how: tuple[cause_choices.CauseLine, ...]
    followed: Options
    cause: str
    avoidable: Options
    chosen: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class CausesPage(Page):
    """Deaths, rates and life tables by cause."""

    template: ClassVar[str] = "causes/page.html"
    care: Sentence  # where readers find help; empty where no cause asks for it
    drawn: frozenset[str]  # keys of the pictures there are
    premature: Sentence
    avoidable: Sentence
    official: Sentence
    course: Sentence  # what its years can be compared over; empty where nothing parts them
    computed: tuple[Sentence, ...]
    basis: tuple[Sentence, ...]
    further: tuple[Sentence, ...]
    choice: Choice


def build(session: Session, heading: Heading, question: CausesQuestion) -> CausesPage:
    found = cause_figures(session, heading, question)
    drawn = _charts(found, frames.source(heading))
    young = tables.young_deaths(found)
    return CausesPage(
        frame=_frame(found),
        answer=_answer(found),
        lead=_lead(found),
        tables=_tables(found),
        charts=drawn,
        cautions=_cautions(session, found),
        twins=frames.twins(heading, question),
        care=care.told(found.named),
        drawn=frozenset(chart.key for chart in drawn),
        premature=say.premature(
            float(young.sum()), float(found.panel.deaths.sum()), found.all["75q0"]
        ),
        avoidable=_avoidable(found),
        official=say.official(),
        course=_course(found),
        computed=_computed(found),
        basis=frames.basis(heading.edition.basis),
        further=_further(found),
        choice=_choice(found),
    )


def doorway(
    heading: Heading, held: Holdings, of: PopulationYear, figures: str, settings: str
) -> tuple[Sentence, ...]:
    """A link to this page from others about the same people; none where there is no such page."""
    if not held_by_cause(heading, held, of, figures):
        return ()
    question = CausesQuestion(of, causes=CauseChoice(), figures=figures, settings=settings)
    place = address(heading.collection.code, heading.edition.number, question)
    return ((Piece(say.question(), place),),)


def _charts(found: CauseFigures, source: str) -> tuple[Chart, ...]:
    made = (charts.ranked, charts.by_age, charts.course)
    drawn = (draw(found, source) for draw in made)
    return charts_given((chart for chart in drawn if chart is not None), found.loaded)


def _tables(found: CauseFigures) -> tuple[Table, ...]:
    own = marks(found.holdings, found.of, found.loaded)
    made = [tables.deaths(found), tables.rates(found), tables.lives(found)]
    made += [tables.by_age(found), tables.unevenness(found)] if found.readable else []
    made += [tables.premature(found), tables.targets(found)]
    course = tables.course(found)
    shown = tables_given((*made, *([course] if course else [])), found.loaded)
    return tuple(table if table.key == "course" else marked(table, own) for table in shown)


def _answer(found: CauseFigures) -> Sentence:
    one = found.estimates["edagger"] if found.readable else found.deaths.share
    parts = [(cause_choices.name(found.causes[at]), one[at]) for at in found.leading[:TOLD]]
    return say.answer(
        found.of.sex,
        found.name,
        found.period,
        found.all["edagger"],
        parts,
        float(found.panel.deaths.sum()),
        unit=tables.years(found),
    )


def _lead(found: CauseFigures) -> tuple[Sentence, ...]:
    if not found.leading:
        return ()
    said = [say.external(cause_choices.name(found.causes[at]) for at in found.leading[:TOLD])]
    first = found.leading[0]
    if found.readable:
        said.append(say.meaning(found.all["e0"]))
        most = max(found.leading, key=lambda at: float(found.deaths.deaths[at]))
        said.append(
            say.most_deaths(
                cause_choices.name(found.causes[most]),
                found.deaths.share[most],
                float(found.panel.deaths.sum()),
            )
        )
    elif int(found.all["edagger"].reason) == Reason.OPEN_GROUP_TOO_LARGE:
        said.append(_not_read(found))
    gained = found.estimates["gain"][first]
    if np.isfinite(gained.value):
        said.append(say.gain(cause_choices.name(found.causes[first]), gained, tables.years(found)))
    return tuple(sentence for sentence in said if sentence)


def _not_read(found: CauseFigures) -> Sentence:
    """That the ages end too early, and the settings that help."""
    place = (found.heading.collection.code, found.heading.edition.number)
    law = Piece(LAW, address(*place, replace(found.question, settings=LAW)))
    return say.not_read(reason(int(found.all["edagger"].reason), found.settings), law)


def _avoidable(found: CauseFigures) -> Sentence:
    of = found.avoidable
    if of is None:
        return say.no_avoidable()
    labels = [cause_choices.name(one) for one in of.causes]
    return say.avoidable(labels, of.deaths, of.estimates["asr75_esp2013"])


def _course(found: CauseFigures) -> Sentence:
    of = found.course
    if of is None:
        return ()
    return say.coding(
        sorted({one.period for one in of.breaks}),
        [(one.period, one.ratio) for one in of.bridged if one.ratio is not None],
    )


def _frame(found: CauseFigures) -> Frame:
    headline = None
    if found.moved is not None:
        e0 = INDICATORS["e0"]
        headline = Headline(_(e0.label), e0.unit, float(found.all["e0"].value), found.moved.value)
    who = names.population(found.of.sex, found.name)
    return frames.pinned(
        found.heading,
        found.question,
        title=_("Causes of death: {who}, {year}", who=who, year=found.period),
        place=(Piece(_("{who} in {year}", who=who, year=found.period), "#further"),),
        figures=found.question.figures,
        settings=found.question.settings,
        notices=frames.notices(found.heading, found.question, found.moved, headline),
    )


def _cautions(session: Session, found: CauseFigures) -> tuple[Caution, ...]:
    panel, settings, asked = found.panel, found.settings, found.question
    provisional_years = [found.period] if found.loaded.status == "provisional" else []
    moved_before = provisional.caution(
        session,
        found.heading,
        found.holdings,
        asked.settings,
        asked.figures,
        any_=bool(provisional_years),
    )
    return frames.cautions(
        beside=[
            caution(found.loaded),
            basis.provisional(provisional_years),
            moved_before,
            cause_methods.unclear(
                found.held.of_kind,
                float(panel.deaths.sum()),
                provisional=bool(provisional_years),
            ),
            basis.estimated(
                [names.population(found.of.sex, found.name)] if found.loaded.estimated else []
            ),
            basis.few_person_years(float(panel.exposure.sum()), settings),
        ],
        below=[cause_methods.certified(), cause_methods.no_forecast(), *basis.reading(settings)],
    )


def _computed(found: CauseFigures) -> tuple[Sentence, ...]:
    choice = found.question.causes
    ratios = [
        (_label(found, one.cause), one.period, one.ratio)
        for one in found.held.ratios
        if one.ratio is not None
    ]
    return (
        *cause_methods.computed(choice.pairs if choice else (), ratios),
        *(_method(one) for one in NUMBERS),
        *basis.computed(found.settings),
        *sharing.computed(found.panel),
    )


def _label(found: CauseFigures, code: str) -> str:
    listed = (*found.holdings.causes, *found.causes)
    return next((cause_choices.name(one) for one in listed if one.code == code), code)


def _method(one: CauseNumber) -> Sentence:
    return cause_methods.method(one.label, one.definition, one.source)


def _further(found: CauseFigures) -> tuple[Sentence, ...]:
    """The life table; the causes of what lies between these people and the whole, or a year."""
    heading, held, asked, of = found.heading, found.holdings, found.question, found.of
    place = (heading.collection.code, heading.edition.number)
    life = PopulationYearQuestion(of, asked.figures, asked.settings)
    links = [
        phrase(
            _("{link} in {year}: life expectancy, survivors and death rates."),
            link=Piece(_("How long they live"), address(*place, life)),
            year=found.period,
        )
    ]
    previous = held.previous(of, found.settings.years)
    if previous is not None:
        between = ComparisonQuestion(
            of, previous, figures=asked.figures, settings=asked.settings, causes=asked.causes
        )
        links.append(
            phrase(
                _("{link}, by age and cause."),
                link=Piece(
                    _("What lies between {this} and {that}", this=of.period, that=previous.period),
                    address(*place, between),
                ),
            )
        )
    return tuple(links)


def _choice(found: CauseFigures) -> Choice:
    asked, heading = found.question, found.heading
    listed = tuple((one.code, cause_choices.name(one)) for one in found.holdings.causes)
    chosen = found.course.cause.code if found.course else ""
    return Choice(
        Another(
            action=f"/c/{heading.collection.code}/{heading.edition.number}/{asked.view}",
            of=asked.of,
            offer=offer(found.holdings, found.settings.years),
            figures=asked.figures,
            settings=asked.settings,
        ),
        cause_choices.lines(asked.causes),
        listed,
        asked.cause or chosen,
        listed,
        asked.avoidable,
    )
