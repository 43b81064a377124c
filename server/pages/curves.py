"""Which curve lies behind the death rates? One area, sex and year."""

from dataclasses import dataclass, replace
from typing import ClassVar

import numpy as np

from engine.estimates import Reason
from engine.indicators import INDICATORS
from server.charts.chart import Chart
from server.exports.table import Table
from server.pages import curves_charts as charts
from server.pages import curves_tables as tables
from server.pages import frames
from server.pages.choices import Choice, choice
from server.pages.page import Caution, Frame, Page
from server.pages.statuses import marked, marks
from server.pages.withholding import caution, charts_given, tables_given
from server.results.curves import Curves, curves, enough_lived
from server.results.laws import rivals
from server.results.questions import (
    DEFAULT_INDICATOR,
    ComparisonQuestion,
    CurvesQuestion,
    PopulationYearQuestion,
    Question,
    address,
)
from server.sentences import basis, curve_methods, names, sharing
from server.sentences import curves as say
from server.sentences.pieces import Piece, Sentence
from server.sentences.reasons import reason
from server.sentences.standing import Headline
from server.sentences.text import _
from server.store.connect import Session
from server.store.heading import Heading


@dataclass(frozen=True, slots=True, kw_only=True)
class CurvesPage(Page):
    """Laws and smooth curves fitted to one population's death rates."""

    template: ClassVar[str] = "curves/page.html"
    drawn: frozenset[str]  # keys of the pictures there are
    laws: Sentence  # which other laws do as well; empty where none fits
    single: Sentence  # how single years are worked out; empty where they are not
    related: tuple[Sentence, ...]  # level and shape against the whole; empty where there is none
    computed: tuple[Sentence, ...]
    basis: tuple[Sentence, ...]
    further: tuple[Sentence, ...]
    choice: Choice


def build(session: Session, heading: Heading, question: CurvesQuestion) -> CurvesPage:
    found = curves(session, heading, question)
    drawn = _charts(found, frames.source(heading))
    return CurvesPage(
        frame=_frame(found),
        answer=_answer(found),
        lead=_lead(found),
        tables=_tables(found),
        charts=drawn,
        cautions=_cautions(found),
        twins=frames.twins(heading, question),
        drawn=frozenset(chart.key for chart in drawn),
        laws=_laws(found),
        single=say.single(found.panel.grid.label) if found.single else (),
        related=_related(found),
        computed=_computed(found),
        basis=frames.basis(heading.edition.basis),
        further=_further(found),
        choice=choice(heading, found.holdings, question),
    )


def _computed(found: Curves) -> tuple[Sentence, ...]:
    methods = curve_methods.computed(
        found.settings,
        grouped=found.single is not None,
        whole_area=found.related.area if found.related else "",
    )
    return (*methods, *sharing.computed(found.panel, fits=True))


def _charts(found: Curves, source: str) -> tuple[Chart, ...]:
    made = (charts.rates(found, source), charts.residuals(found, source))
    return charts_given((chart for chart in made if chart is not None), found.loaded)


def _tables(found: Curves) -> tuple[Table, ...]:
    made = (
        tables.curves(found),
        tables.residuals(found),
        tables.laws(found),
        tables.single(found),
        tables.relation(found.related),
    )
    filled = (table for table in made if table is not None and table.rows)
    own = marks(found.holdings, found.of, found.loaded)
    return tuple(marked(table, own) for table in tables_given(filled, found.loaded))


def _answer(found: Curves) -> Sentence:
    of, best = found.of, found.best
    if best is None:
        enough = enough_lived(found.panel, found.settings)
        why = Reason.NONE if enough else Reason.TOO_FEW_PERSON_YEARS
        return say.no_answer(of.sex, found.name, found.period, reason(why, found.settings))
    label = _(best.law.label)
    return say.answer(
        of.sex,
        found.name,
        found.period,
        label,
        best.first,
        misses=best.misses,
        rough=best.rough,
    )


def _lead(found: Curves) -> tuple[Sentence, ...]:
    best = found.best
    if best is None:
        return ()
    law, fit = best.law, best.fit
    background = 0.0
    if "background" in law.names:
        background = float(np.exp(fit.parameters[law.position("background")]))
    return (
        say.meaning(best.mode, best.slope, background=background, levels_off=law.saturates),
        say.fitness(
            float(fit.deviance), best.bound, best.free, misses=best.misses, rough=best.rough
        ),
    )


def _laws(found: Curves) -> Sentence:
    best = found.best
    if best is None:
        return ()
    others = [
        (_(one.law.label), float(one.fit.aic - best.fit.aic)) for one in rivals(found.laws, best)
    ]
    return say.rivals(_(best.law.label), others)


def _related(found: Curves) -> tuple[Sentence, ...]:
    of = found.related
    if of is None:
        return ()
    said = say.related(of.area, of.median, of.level, of.shape)
    return (said, say.poorly_related(of.area)) if of.misses else (said,)


def _frame(found: Curves) -> Frame:
    heading, of, best = found.heading, found.of, found.best
    headline = None
    if found.moved is not None:
        headline = Headline(
            _("Rise of death rates with age by the law of {law}", law=_(best.law.label))
            if best
            else "",
            INDICATORS["ageing_rate"].unit,
            best.slope.value if best else np.nan,
            found.moved.value,
        )
    who = names.population(of.sex, found.name)
    return frames.pinned(
        heading,
        found.question,
        title=_(
            "Curves behind the death rates: {who}, {year}",
            who=names.population(of.sex, found.name),
            year=found.period,
        ),
        place=(Piece(_("{who} in {year}", who=who, year=found.period), "#further"),),
        figures=found.question.figures,
        settings=found.question.settings,
        notices=frames.notices(heading, found.question, found.moved, headline),
    )


def _cautions(found: Curves) -> tuple[Caution, ...]:
    panel = found.panel
    provisional = [found.period] if found.loaded.status == "provisional" else []
    empty = [
        label
        for label, deaths, years in zip(
            panel.grid.labels, panel.deaths, panel.exposure, strict=True
        )
        if deaths == 0 and years > 0
    ]
    joined = zip(panel.grid.labels, found.chain.rates.joined, strict=True)
    return frames.cautions(
        beside=[
            caution(found.loaded),
            basis.provisional(provisional),
            basis.few_person_years(float(panel.exposure.sum()), found.settings),
        ],
        below=[
            basis.no_deaths(empty, rounded=bool(found.loaded.rounded)),
            basis.joined([label for label, is_so in joined if is_so]),
            say.description(),
            basis.chance(),
        ],
    )


def _further(found: Curves) -> tuple[Sentence, ...]:
    """Back to the life table; the same curves for the other sex and the whole; the comparison."""
    heading, held, asked, of = found.heading, found.holdings, found.question, found.of
    rest = (asked.figures, asked.settings)

    def link(words: str, question: Question) -> Piece:
        return Piece(words, address(heading.collection.code, heading.edition.number, question))

    life = link(
        _("Life table of {who}", who=names.sex_and_year(of.sex, found.period)),
        PopulationYearQuestion(of, *rest),
    )
    whole = replace(of, area=found.parent)
    beside = [(replace(of, sex=sex), names.sex(sex)) for sex in ("f", "m", "p") if sex != of.sex]
    beside.append((whole, held.name(found.parent)))
    others = [
        link(words, CurvesQuestion(one, *rest)) for one, words in beside if one in held.status
    ]
    compared = None
    if whole in held.status:
        words = _("Compare it with {area}, of which it is part", area=held.name(found.parent))
        pair = ComparisonQuestion(of, whole, DEFAULT_INDICATOR, *rest, overlap="rest")
        compared = link(words, pair.simplified())
    return say.further(life, others, compared)
