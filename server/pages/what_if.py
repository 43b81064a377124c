"""What would the figures be at other death rates? One area, sex and year."""

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from engine.indicators import find
from server.charts.chart import Chart
from server.exports.table import Table
from server.pages import frames, provisional
from server.pages import what_if_charts as charts
from server.pages import what_if_tables as tables
from server.pages.page import Caution, Frame, Page
from server.pages.statuses import marked, marks
from server.pages.what_if_form import Form, form
from server.pages.what_would_change import back
from server.pages.withholding import caution, charts_given, tables_given
from server.results.questions import PopulationYear, PopulationYearQuestion, address
from server.results.what_if import Findings, what_if_of
from server.results.what_if_question import WhatIfQuestion
from server.sentences import basis, breaks, care, names, sharing, targets
from server.sentences import death_rates as of_rates
from server.sentences import what_if as say
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.reasons import reason
from server.sentences.standing import Headline
from server.sentences.text import _
from server.store.connect import Session
from server.store.heading import Heading


@dataclass(frozen=True, slots=True, kw_only=True)
class WhatIfPage(Page):
    """Every figure at other death rates, and what it would take to reach a target."""

    template: ClassVar[str] = "what-if/page.html"
    question: WhatIfQuestion
    toward: PopulationYear  # what the form shows of the benchmark: an area without a code is none
    form: Form
    drawn: frozenset[str]  # keys of the pictures there are
    by_cause: bool  # whether there is a table of deaths by cause
    groups: tuple[tuple[str, str], ...]  # further tables of figures, and what each is about
    computed: tuple[Sentence, ...]
    basis: tuple[Sentence, ...]
    further: tuple[Sentence, ...]


def build(session: Session, heading: Heading, question: WhatIfQuestion) -> WhatIfPage:
    found = what_if_of(session, heading, question)
    drawn = _charts(found, frames.source(heading))
    made = _tables(found)
    return WhatIfPage(
        frame=_frame(found),
        answer=_answer(found),
        lead=_lead(found),
        tables=made,
        charts=drawn,
        cautions=_cautions(found, _moved_before(session, found)),
        twins=frames.twins(heading, question),
        question=question,
        toward=question.toward or PopulationYear("", question.at.sex, question.at.period),
        form=form(found),
        drawn=frozenset(chart.key for chart in drawn),
        by_cause=any(table.key == "causes" for table in made),
        groups=tuple((table.key, table.title) for table in tables.further(found)),
        computed=(*basis.computed(found.settings), *_computed(found)),
        basis=frames.basis(heading.edition.basis),
        further=_further(found),
    )


def _charts(found: Findings, source: str) -> tuple[Chart, ...]:
    made = (charts.rates(found, source), charts.fewer(found, source))
    return charts_given((chart for chart in made if chart is not None), *found.sides)


def _tables(found: Findings) -> tuple[Table, ...]:
    made = [tables.figures(found), *tables.further(found), tables.deaths(found)]
    by_cause = tables.by_cause(found)
    made += [by_cause] if by_cause else []
    own = marks(found.holdings, found.at, found.loaded)
    if found.question.toward and found.toward:
        theirs = marks(found.holdings, found.question.toward, found.toward)
        both = own.beside(theirs)
        columns = {"now": own, "there": own}
        return tuple(marked(table, both, columns) for table in tables_given(made, *found.sides))
    return tuple(marked(table, own) for table in tables_given(made, *found.sides))


def _who(found: Findings) -> str:
    return names.population(found.at.sex, found.name)


def _answer(found: Findings) -> Sentence:
    one, numbers = find(found.question.of), found.changed.numbers
    if not found.anything:
        now = numbers.now[one.key]
        why = reason(int(now.reason), found.settings)
        return say.unchanged(_who(found), found.period, one, now, why)
    moved = say.Moved(one, numbers.now[one.key], numbers.then[one.key], numbers.change[one.key])
    why = reason(int(moved.change.reason), found.settings)
    return say.answer(_who(found), found.period, tables.said(found), moved, why)


def _lead(found: Findings) -> tuple[Sentence, ...]:
    numbers, said = found.changed.numbers, []
    if found.anything:
        if len(tables.said(found)) > of_rates.NAMED:
            said.append(say.listed(tables.said(found)))
        fewer, left = float(numbers.fewer.sum()), float(numbers.years.sum())
        said.append(say.stands_for(found.period, fewer, left))
    first = care.told(found.changed.own.causes)
    return tuple(sentence for sentence in (first, *said, _target(found)) if sentence)


def _target(found: Findings) -> Sentence:
    changed, one = found.changed, find(found.question.of)
    if changed.no_reach:
        return targets.no_reach(changed.no_reach)
    if changed.reach is None:
        return ()
    where = of_rates.chosen(tables.chosen(found))
    return targets.reach(one, found.question.target, where, changed.reach)


def _computed(found: Findings) -> tuple[Sentence, ...]:
    target = (targets.computed_target(),) if found.question.target else ()
    return (*say.computed(), *target, *sharing.computed(*(side.panel for side in found.sides)))


def _frame(found: Findings) -> Frame:
    heading, of = found.heading, found.at
    one, headline = find(found.question.of), None
    if found.moved is not None:
        label = _(one.label)
        if found.anything:
            label = _("Change of {label}", label=names.inside(label))
        headline = Headline(label, one.unit, float(found.headline.value), found.moved.value)
    own = PopulationYearQuestion(of, found.question.figures, found.question.settings)
    place = address(heading.collection.code, heading.edition.number, own)
    return frames.pinned(
        heading,
        found.question,
        title=_(
            "{who}, {year}: what if",
            who=names.population_first(of.sex, found.name),
            year=found.period,
        ),
        place=phrase(
            _("{who}: what if"),
            who=Piece(_("{who} in {year}", who=_who(found), year=found.period), place),
        ),
        figures=found.question.figures,
        settings=found.question.settings,
        notices=frames.notices(heading, found.question, found.moved, headline),
    )


def _moved_before(session: Session, found: Findings) -> basis.Told:
    asked, any_ = found.question, any(side.status == "provisional" for side in found.sides)
    return provisional.caution(
        session, found.heading, found.holdings, asked.settings, asked.figures, any_=any_
    )


def _cautions(found: Findings, moved_before: basis.Told) -> tuple[Caution, ...]:
    panel, settings = found.changed.own.panel, found.settings
    sides = [(found.at, found.loaded)]
    if found.question.toward and found.toward:
        sides.append((found.question.toward, found.toward))
    modelled = settings.open_interval != "one_over_m"
    early = not modelled and panel.grid.open_age < settings.sound_open_age
    return frames.cautions(
        beside=[
            caution(*found.sides),
            basis.provisional(
                sorted({found.years_of(of) for of, one in sides if one.status == "provisional"})
            ),
            moved_before,
            basis.estimated(
                [
                    names.population(of.sex, found.holdings.name(of.area))
                    for of, one in sides
                    if one.estimated
                ]
            ),
            *(
                breaks.mixed(
                    found.holdings.mixed(of, settings.years),
                    names.population(of.sex, found.holdings.name(of.area)),
                )
                for of, _one in sides
            ),
            basis.few_person_years(float(panel.exposure.sum()), settings),
            basis.law(settings, panel.grid.open_age) if modelled else None,
            basis.smoothed(settings),
            basis.early_end(panel.grid.open_age) if early else None,
        ],
        below=[
            say.arithmetic(),
            say.one_by_one() if found.changed.own.causes else None,
            say.by_sex_held()
            if found.toward and len(set(found.changed.own.parts.sexes)) > 1
            else None,
            say.both_counted() if found.overlap else None,
            basis.safe_side(find(found.question.of), float(np.sum(panel.exposure))),
            *basis.reading(settings),
        ],
    )


def _further(found: Findings) -> tuple[Sentence, ...]:
    asked = found.question
    own = (found.heading, asked.at, asked.figures, asked.settings)
    return back(*own, but=WhatIfQuestion, causes=asked.causes)
