"""How many deaths fewer make a month of life expectancy? One area, sex and year."""

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from engine.standardisation import FEW_DEATHS
from server.charts.chart import At, Chart, Series
from server.charts.scales import log_ticks
from server.exports.table import Cell, Column, Gap, Row, Table
from server.pages import cause_choices, frames
from server.pages.cells import count, number, withheld
from server.pages.choices import Choice, choice
from server.pages.drawing import ages as age_axis
from server.pages.drawing import at_age, places, values
from server.pages.page import Caution, Page
from server.pages.statuses import marked, marks
from server.pages.what_would_change import back, frame, moved_before
from server.pages.withholding import caution, charts_given, tables_given
from server.results.exchange import Exchange, ExchangeQuestion, exchange
from server.sentences import basis, breaks, care, names, sharing
from server.sentences import exchange as say
from server.sentences.models import out_of_reach
from server.sentences.pieces import Sentence
from server.sentences.reasons import reason
from server.sentences.text import _
from server.store.connect import Session
from server.store.heading import Heading


@dataclass(frozen=True, slots=True, kw_only=True)
class ExchangePage(Page):
    """Deaths fewer at each age and of each cause for a month, beside the deaths there were."""

    template: ClassVar[str] = "exchange/page.html"
    drawn: frozenset[str]  # keys of the pictures there are
    by_cause: bool  # whether there are deaths by cause
    choice: Choice
    how: tuple[cause_choices.CauseLine, ...]  # causes are shown
    computed: tuple[Sentence, ...]
    basis: tuple[Sentence, ...]
    further: tuple[Sentence, ...]


def build(session: Session, heading: Heading, question: ExchangeQuestion) -> ExchangePage:
    found = exchange(session, heading, question)
    drawn = _charts(found, frames.source(heading))
    return ExchangePage(
        frame=frame(
            found,
            _("{who}, {year}: deaths for a month of life expectancy"),
            _("{who}: deaths for a month of life expectancy"),
        ),
        answer=_answer(found),
        lead=_lead(found),
        tables=_tables(found),
        charts=drawn,
        cautions=_cautions(
            found, moved_before(session, found, any_=found.loaded.status == "provisional")
        ),
        twins=frames.twins(heading, question),
        drawn=frozenset(chart.key for chart in drawn),
        by_cause=bool(found.own.causes) and found.readable,
        choice=choice(heading, found.holdings, question),
        how=cause_choices.lines(question.causes),
        computed=(
            *basis.computed(found.settings),
            *say.computed(),
            *sharing.computed(found.loaded.panel),
        ),
        basis=frames.basis(heading.edition.basis),
        further=_further(found),
    )


def _who(found: Exchange) -> str:
    return names.population(found.of.sex, found.name)


def _answer(found: Exchange) -> Sentence:
    if not found.readable:
        why = reason(int(found.e0.reason), found.settings)
        return say.no_answer(_who(found), found.period, why)
    deaths = float(found.own.panel.deaths.sum())
    return say.answer(_who(found), found.period, found.everywhere, deaths)


def _lead(found: Exchange) -> tuple[Sentence, ...]:
    said = [care.told(found.own.causes)]
    fewer, grid = found.avoidable.deaths, found.own.panel.grid
    enough = (found.own.panel.deaths >= FEW_DEATHS) & ~found.withheld & np.isfinite(fewer)
    if found.readable and enough.any():
        low, high = (
            int(of(np.where(enough, fewer, np.nan))) for of in (np.nanargmin, np.nanargmax)
        )
        said.append(
            say.from_to(
                (grid.labels[low], float(fewer[low])),
                (grid.labels[high], float(fewer[high])),
                int(np.isnan(fewer[~found.withheld]).sum()),
            )
        )
    return tuple(sentence for sentence in said if sentence)


def _tables(found: Exchange) -> tuple[Table, ...]:
    made = [_ages(found)]
    if found.own.causes:
        made.append(_causes(found))
    own = marks(found.holdings, found.of, found.loaded)
    return tuple(marked(table, own) for table in tables_given(made, found.loaded))


def _ages(found: Exchange) -> Table:
    """How many deaths fewer at each age, all deaths there were, and those of each cause."""
    of, grid, causes = found.avoidable, found.own.panel.grid, found.own.causes
    by_cause = found.own.parts.deaths.reshape(-1, max(1, len(causes)), len(grid)).sum(axis=0)
    heads = [
        Column("age", _("age")),
        Column("fewer", _("deaths fewer for one month"), decimals=1),
        Column("there", _("deaths there were"), decimals=0, counted=True),
    ]
    heads += [
        Column(
            _key(one.code), cause_choices.name(one), decimals=0, counted=True, span=_("of these")
        )
        for one in causes
    ]
    rows = []
    for at, label in enumerate(grid.labels):
        cells: list[Cell] = [number(float(of.deaths[at]), out_of_reach()), count(of.there[at])]
        cells += [
            withheld() if found.hidden[cause, at] else count(float(by_cause[cause, at]))
            for cause in range(len(causes))
        ]
        rows.append(Row((label, *([withheld()] * len(cells) if found.withheld[at] else cells))))
    short = any(isinstance(cell, Gap) and cell.reason for row in rows for cell in row.cells[1:2])
    note = _("Deaths of all ages and causes as they were, but for those fewer at one age.")
    if short:
        note += " " + _("Where there is no number, not even all deaths of that age make a month.")
    title = _(
        "Deaths fewer at one age for a month of life expectancy, {who}",
        who=names.sex_and_year(found.of.sex, found.period),
    )
    return Table("ages", title, tuple(heads), tuple(rows), note)


def _key(code: str) -> str:
    """A cause's code as a column's key."""
    return "cause_" + "".join(sign if sign.isalnum() else "_" for sign in code.lower())


def _causes(found: Exchange) -> Table:
    """What share of each cause's deaths, at all ages alike, makes a month."""
    parts, causes = found.own.parts, found.own.causes
    there = parts.deaths.sum(axis=-1)[: len(causes)]
    factor = found.by_cause.factor
    rows = tuple(
        Row(
            (
                one.code,
                count(float(there[at])),
                number(100 * (1 - float(factor[at])), say.out_of_reach_cause()),
                number((1 - float(factor[at])) * float(there[at]), say.out_of_reach_cause()),
            ),
            shown=cause_choices.name(one),
        )
        for at, one in enumerate(causes)
    )
    heads = (
        Column("cause", _("cause")),
        Column("there", _("deaths there were"), decimals=0, counted=True),
        Column("share", _("share fewer for one month"), _("% at all ages alike"), 1),
        Column("fewer", _("deaths fewer for one month"), decimals=1),
    )
    title = _("Deaths fewer of one cause, at all ages alike, for a month of life expectancy")
    note = _("Where there is no number, not even all deaths of that cause make a month.")
    return Table("causes", title, heads, rows, note)


def _charts(found: Exchange, source: str) -> tuple[Chart, ...]:
    if not found.readable:
        return ()
    grid, of = found.own.panel.grid, found.avoidable
    there, fewer = (
        np.where((column > 0) & ~found.withheld, column, np.nan)[:-1]
        for column in (of.there, of.deaths)
    )
    both = np.concatenate([there, fewer])
    if not np.isfinite(both).any():
        return ()
    low, high = float(np.nanmin(both)) / 1.4, float(np.nanmax(both)) * 1.4

    def line(column: np.ndarray, label: str, role: str, at: At) -> Series:
        return Series(
            label,
            places(grid.mids[:-1]),
            values(column),
            sex=found.of.sex,  # type: ignore[arg-type]
            role=role,
            weight="this" if role == "s1" else "that",
            names=grid.labels[:-1],
            at=at,
        )

    upper = max(low, 1.7 * at_age(grid, np.append(there, np.nan), 56))
    lower = at_age(grid, np.append(fewer, np.nan), 62) / 2.2
    chart = Chart(
        key="exchange",
        finding=say.finding(int(np.isnan(of.deaths).sum())),
        unit=_("Deaths in each age group, ratio scale"),
        source=source,
        described=_("Two lines of deaths by age; the numbers are in the table below it."),
        x_kind="age",
        x_range=age_axis(grid),
        y_title=_("deaths"),
        y_range=(low, high),
        y_ticks=log_ticks(low, high),
        y_log=True,
        hover=_("age %{customdata}: %{y:,.1f} deaths"),
        table="ages",
        series=(
            line(
                fewer,
                _("deaths fewer for one month"),
                "s1",
                At(60, max(lower, 1.3 * low), "left", 0, narrow_x=48, narrow_y=1.3 * low),
            ),
            line(
                there,
                _("deaths there were"),
                "s2",
                At(54, min(upper, high / 1.3), "right", 0, narrow_x=56),
            ),
        ),
    )
    return charts_given([chart], found.loaded)


def _cautions(found: Exchange, moved_before: basis.Told) -> tuple[Caution, ...]:
    panel, settings = found.own.panel, found.settings
    return frames.cautions(
        beside=[
            caution(found.loaded),
            basis.provisional([found.period] if found.loaded.status == "provisional" else []),
            moved_before,
            basis.estimated([_who(found)] if found.loaded.estimated else []),
            breaks.mixed(found.holdings.mixed(found.of, settings.years), _who(found)),
            basis.few_person_years(float(panel.exposure.sum()), settings),
            basis.law(settings, panel.grid.open_age) if found.chain.modelled else None,
            basis.smoothed(settings),
            basis.early_end(panel.grid.open_age) if found.chain.open_low else None,
        ],
        below=[
            say.arithmetic(),
            say.whichever_cause() if found.own.causes else None,
            *basis.reading(settings),
        ],
    )


def _further(found: Exchange) -> tuple[Sentence, ...]:
    asked = found.question
    own = (found.heading, asked.of, asked.figures, asked.settings)
    return back(*own, but=ExchangeQuestion, causes=asked.causes)
