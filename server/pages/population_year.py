"""How long do people live here? One area, sex and year."""

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from engine.indicators import INDICATORS
from engine.settings import span
from engine.standardisation import FEW_DEATHS, few_deaths
from server.charts.chart import Chart
from server.exports.table import Table
from server.pages import frames, provisional
from server.pages import population_year_living as living
from server.pages import population_year_models as models
from server.pages import population_year_rates as rates
from server.pages import population_year_tables as tables
from server.pages.causes import doorway
from server.pages.choices import Choice, choice
from server.pages.page import Caution, Frame, Page
from server.pages.statuses import marked, marks
from server.pages.what_would_change import ways
from server.pages.withholding import caution, charts_given, tables_given
from server.results.loading import Loaded
from server.results.population_year import Findings, population_year
from server.results.questions import (
    ComparisonQuestion,
    CurvesQuestion,
    PopulationYear,
    PopulationYearQuestion,
    TrendQuestion,
    address,
)
from server.sentences import basis, breaks, names, sharing
from server.sentences import curves as curves_say
from server.sentences import models as models_say
from server.sentences import population_year as say
from server.sentences import withholding as withholding_say
from server.sentences.pieces import Piece, Sentence
from server.sentences.reasons import reason
from server.sentences.standing import Headline
from server.sentences.text import _
from server.store.connect import Session
from server.store.heading import Heading

POOLED = "almanac-1-3-years"
LAW = "almanac-1-kannisto"  # what to ask for where the open group is too large


@dataclass(frozen=True, slots=True, kw_only=True)
class PopulationYearPage(Page):
    """A life table, its few main numbers and its pictures."""

    template: ClassVar[str] = "population-year/page.html"
    drawn: frozenset[str]  # keys of the pictures there are
    groups: tuple[tuple[str, str], ...]  # further tables of figures, and what each is about
    avoid: Sentence  # where the fewest deaths make a month; empty where it is not known
    implied: Sentence  # whether deaths and people at the highest ages fit together
    about_table: Sentence
    rows: str  # summary of the folded life table
    computed: tuple[Sentence, ...]
    basis: tuple[Sentence, ...]
    further: tuple[Sentence, ...]
    choice: Choice


def build(
    session: Session, heading: Heading, question: PopulationYearQuestion
) -> PopulationYearPage:
    found = population_year(session, heading, question)
    charts = _charts(found, frames.source(heading))
    return PopulationYearPage(
        frame=_frame(found),
        answer=say.answer(
            found.of.sex,
            found.name,
            found.period,
            found.estimates["e0"],
            reason(int(found.estimates["e0"].reason), found.settings),
            years_added=found.settings.years > 1,
        ),
        lead=_lead(found),
        tables=_tables(found),
        charts=charts,
        cautions=_cautions(found, _moved_before(session, found)),
        twins=frames.twins(heading, question),
        drawn=frozenset(chart.key for chart in charts),
        groups=tuple((table.key, table.title) for table in tables.further(found)),
        avoid=_avoid(found),
        implied=_implied(found),
        about_table=say.about_table(found.chain.table.grid.open_age, modelled=found.chain.modelled),
        rows=_rows(found),
        computed=_computed(found),
        basis=(*frames.basis(heading.edition.basis), *_births(found)),
        further=_further(found),
        choice=choice(heading, found.holdings, question),
    )


def _computed(found: Findings) -> tuple[Sentence, ...]:
    return (*basis.computed(found.settings), *sharing.computed(found.loaded.panel))


def _charts(found: Findings, source: str) -> tuple[Chart, ...]:
    """In the order of the page; a picture that would be empty is left out."""
    made = (living.survivors, living.deaths, rates.rates, rates.rise, rates.gain)
    drawn = (draw(found, source) for draw in made)
    return charts_given((chart for chart in drawn if chart is not None), *_sides(found))


def _tables(found: Findings) -> tuple[Table, ...]:
    made = [tables.figures(found), *tables.further(found), tables.life(found), tables.rises(found)]
    if found.gainful:
        made += [tables.gains(found), models.avoidable(found)]
    implied = models.implied(found)
    made += [implied] if implied else []
    shown = tables_given((table for table in made if table.rows), *_sides(found))
    return tuple(_marked(found, table) for table in shown)


def _marked(found: Findings, table: Table) -> Table:
    own = marks(found.holdings, found.of, found.loaded)
    if found.before is None:
        return marked(table, own)
    then = marks(found.holdings, found.before.of, found.before.loaded)
    return marked(table, own, {"before": then, "change": own.beside(then)})


def _sides(found: Findings) -> tuple[Loaded | None, Loaded | None]:
    return found.loaded, found.before.loaded if found.before else None


def _avoid(found: Findings) -> Sentence:
    of, labels = found.avoidable, found.loaded.panel.grid.labels
    enough = (found.loaded.panel.deaths >= FEW_DEATHS) & ~found.withheld
    fewer = np.where(enough, of.deaths, np.nan)
    if not found.gainful or not np.isfinite(fewer).any():
        return ()
    at = int(np.nanargmin(fewer))
    return models_say.avoid(labels[at], float(of.deaths[at]), float(of.there[at]))


def _implied(found: Findings) -> Sentence:
    of = found.implied
    if of is None or not of.known:
        return ()
    population = of.population
    return models_say.implied(population.ratio, population.age, tables.whole_of(found))


def _frame(found: Findings) -> Frame:
    heading, of = found.heading, found.of
    headline = None
    if found.moved is not None:
        headline = Headline(
            _(INDICATORS["e0"].label),
            INDICATORS["e0"].unit,
            float(found.estimates["e0"].value),
            found.moved.value,
        )
    who = names.population(of.sex, found.name)
    return frames.pinned(
        heading,
        found.question,
        title=_("{who}, {year}", who=names.population_first(of.sex, found.name), year=found.period),
        place=(Piece(_("{who} in {year}", who=who, year=found.period), "#further"),),
        figures=found.question.figures,
        settings=found.question.settings,
        notices=frames.notices(heading, found.question, found.moved, headline),
    )


def _lead(found: Findings) -> tuple[Sentence, ...]:
    said: list[Sentence] = []
    if found.before is not None and say.known(found.estimates, "e0"):
        said.append(say.change(found.before.change["e0"], found.before.period))
    said.append(say.meanings(found.estimates))
    law = address(
        found.heading.collection.code,
        found.heading.edition.number,
        PopulationYearQuestion(found.of, found.question.figures, LAW),
    )
    said.append(
        say.not_read(
            found.estimates,
            open_age=found.loaded.panel.grid.open_age,
            reach=float(found.chain.open_reach),
            law=Piece(LAW, law),
        )
    )
    return tuple(sentence for sentence in said if sentence)


def _provisional(found: Findings) -> list[str]:
    """The years shown that are provisional."""
    sides = [(found.period, found.loaded)]
    sides += [(found.before.period, found.before.loaded)] if found.before else []
    return [period for period, loaded in sides if loaded.status == "provisional"]


def _moved_before(session: Session, found: Findings) -> basis.Told:
    asked, any_ = found.question, bool(_provisional(found))
    held = found.holdings
    return provisional.caution(
        session, found.heading, held, asked.settings, asked.figures, any_=any_
    )


def _cautions(found: Findings, moved_before: basis.Told) -> tuple[Caution, ...]:
    before, rate, whole = found.before, found.chain.rates, tables.whole_of(found)
    panel = found.loaded.panel
    joined = [label for label, is_so in zip(panel.grid.labels, rate.joined, strict=True) if is_so]
    empty = [
        label
        for label, deaths, years in zip(
            panel.grid.labels, panel.deaths, panel.exposure, strict=True
        )
        if deaths == 0 and years > 0
    ]
    return frames.cautions(
        beside=[
            caution(*_sides(found)),
            basis.provisional(_provisional(found)),
            moved_before,
            basis.estimated(
                [names.population(found.of.sex, found.name)] if found.loaded.estimated else []
            ),
            breaks.cut_off(
                found.holdings.cut_off(found.of, found.settings.years)
                if found.settings.years == 1
                else (),
                found.period,
            ),
            breaks.mixed(
                found.holdings.mixed(found.of, found.settings.years),
                names.population(found.of.sex, found.name),
            ),
            basis.few_person_years(float(panel.exposure.sum()), found.settings),
            basis.few_deaths(float(panel.deaths.sum()), names.population(found.of.sex, found.name))
            if few_deaths(INDICATORS["asr_esp2013"], panel.deaths)
            else None,
            basis.law(found.settings, panel.grid.open_age) if found.chain.modelled else None,
            basis.smoothed(found.settings),
            basis.borrowed(panel.grid.open_age, whole) if found.chain.borrowed else None,
            basis.early_end(panel.grid.open_age) if found.chain.open_low else None,
        ],
        below=[
            basis.safe_side(INDICATORS["e0"], float(panel.exposure.sum())),
            basis.no_deaths(
                empty,
                drawn=found.settings.smoothing != "none",
                rounded=bool(found.loaded.rounded),
            ),
            basis.joined(joined),
            basis.regrouped(before.period)
            if before and before.loaded.panel.grid != panel.grid
            else None,
            *basis.reading(found.settings),
        ],
    )


def _births(found: Findings) -> tuple[Sentence, ...]:
    births = float(found.loaded.panel.births[0])
    return () if np.isnan(births) else (say.births(found.of.sex, found.name, found.period, births),)


def _rows(found: Findings) -> str:
    return say.table_rows(
        names.population(found.of.sex, found.name),
        found.period,
        len(found.chain.table.grid),
    )


def _further(found: Findings) -> tuple[Sentence, ...]:
    """Where to go from here: the same people earlier, the other sex, the whole, the years."""
    heading, held, asked = found.heading, found.holdings, found.question
    of, links, years = found.of, [], found.settings.years
    where = (heading.collection.code, heading.edition.number)

    def compared(that: PopulationYear, words: str) -> None:
        if that != of and held.all_of(that, years):
            question = ComparisonQuestion(of, that, "e0", asked.figures, asked.settings, "rest")
            links.append(Piece(words, address(*where, question.simplified())))

    if found.before:
        compared(found.before.of, _("against {year}", year=found.before.period))
    if len(held.periods) >= years:
        first = PopulationYear(of.area, of.sex, held.periods[years - 1])
        compared(first, _("against {year}", year=names.years(span(first.period, years))))
    for sex in ("f", "m"):
        if sex != of.sex:
            compared(
                PopulationYear(of.area, sex, of.period), _("against {who}", who=names.sex(sex))
            )
    parent = next((area.parent for area in held.areas if area.code == of.area), "")
    if parent:
        compared(
            PopulationYear(parent, of.sex, of.period),
            _("against {area}, of which it is part", area=held.name(parent)),
        )
    trend = TrendQuestion(
        areas=(of.area,),
        sexes=(of.sex,),
        first=held.periods[0],
        last=held.periods[-1],
        figures=asked.figures,
        settings=asked.settings,
    )
    course = Piece(
        _("Life expectancy from {first} to {last}", first=trend.first, last=trend.last),
        address(*where, trend),
    )
    curves = CurvesQuestion(of, asked.figures, asked.settings)
    behind = Piece(curves_say.question(), address(*where, curves))
    change = ways(heading, of, asked.figures, asked.settings)
    shown = doorway(heading, held, of, asked.figures, asked.settings)
    also = (*shown, *models.why(found), *_in_full(found))
    return (*basis.further(tuple(links), course), change, (behind,), *also)


def _in_full(found: Findings) -> tuple[Sentence, ...]:
    """Where counts are withheld: persons, who need it less, and three years added up; and why."""
    if not found.loaded.protected:
        return ()
    heading, of, asked = found.heading, found.of, found.question

    def link(words: str, one: PopulationYear, settings: str) -> Piece:
        question = PopulationYearQuestion(one, asked.figures, settings)
        return Piece(words, address(heading.collection.code, heading.edition.number, question))

    persons = PopulationYear(of.area, "p", of.period)
    ways = []
    if of.sex != "p" and found.holdings.all_of(persons, found.settings.years):
        ways.append(link(names.population("p", found.name), persons, asked.settings))
    if found.settings.years == 1 and found.holdings.all_of(of, 3):
        ways.append(link(_("three years added up"), of, POOLED))
    policy = f"/c/{heading.collection.code}/policy"
    return withholding_say.ways(ways if found.loaded.withheld else [], policy)
