"""What lies between these two? Any two population-years of one edition."""

from dataclasses import dataclass
from typing import ClassVar

from engine import decomposition, indicators
from engine.standardisation import few_deaths, used
from server.charts.chart import Chart
from server.exports.table import Table
from server.pages import comparison_charts as charts
from server.pages import comparison_contributions as contributions
from server.pages import comparison_tables as tables
from server.pages import frames, provisional
from server.pages.choices import Grouped, Offer, offer
from server.pages.choices import indicators as offered
from server.pages.page import Caution, Frame, Page
from server.pages.statuses import marked, marks
from server.pages.withholding import caution, charts_given, tables_given
from server.results.comparison import Comparison, comparison
from server.results.explaining import decomposable
from server.results.questions import (
    ComparisonQuestion,
    PopulationYear,
    PopulationYearQuestion,
    address,
)
from server.sentences import basis, kinds, names, sharing
from server.sentences import breaks as of_breaks
from server.sentences import comparison as say
from server.sentences import contributions as ages_say
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.reasons import reason
from server.sentences.standing import Headline
from server.sentences.text import _
from server.store.connect import Session
from server.store.heading import Heading


@dataclass(frozen=True, slots=True)
class Choice:
    """A plain form that leads to another pair under the same settings."""

    action: str
    offer: Offer
    this: PopulationYear
    that: PopulationYear
    of: str
    indicators: Grouped
    figures: str
    settings: str


@dataclass(frozen=True, slots=True, kw_only=True)
class ComparisonPage(Page):
    """The difference of every figure, and the ages it is made of."""

    template: ClassVar[str] = "comparison/page.html"
    drawn: frozenset[str]  # keys of the pictures there are
    groups: tuple[tuple[str, str], ...]  # further tables of figures, and what each is about
    not_parted: tuple[Sentence, ...]  # what has no picture of contributions, and why
    kinds: Sentence  # of change, from fitted laws; empty where none fits
    ratios: tuple[Sentence, ...]  # how differences of ratios come about
    further: tuple[Sentence, ...]
    computed: tuple[Sentence, ...]
    basis: tuple[Sentence, ...]
    choice: Choice


def build(session: Session, heading: Heading, question: ComparisonQuestion) -> ComparisonPage:
    found = comparison(session, heading, question)
    drawn = _charts(found, frames.source(heading))
    asked = charts.asked(found, question.of)
    return ComparisonPage(
        frame=_frame(found),
        answer=say.answer(
            tables.pair(found), asked, reason(int(asked.difference.reason), found.settings)
        ),
        lead=_lead(found),
        tables=_tables(found),
        charts=drawn,
        cautions=_cautions(found, _moved_before(session, found)),
        twins=frames.twins(heading, question),
        drawn=frozenset(chart.key for chart in drawn),
        groups=tuple((table.key, table.title) for table in tables.further(found)),
        not_parted=_not_parted(found),
        kinds=() if found.same else kinds.told(found.explained.kinds),
        ratios=_ratios(found),
        further=_further(found),
        computed=_computed(found),
        basis=frames.basis(heading.edition.basis),
        choice=_choice(found),
    )


def _charts(found: Comparison, source: str) -> tuple[Chart, ...]:
    made = (charts.survivors, charts.asked_for, charts.life_expectancy, charts.unevenness)
    drawn = (draw(found, source) for draw in made)
    return charts_given(
        (chart for chart in drawn if chart is not None), found.this.loaded, found.that.loaded
    )


def _tables(found: Comparison) -> tuple[Table, ...]:
    made = [tables.figures(found), *tables.further(found)]
    if found.explained.contributions and not found.same:
        made += [contributions.groups(found), contributions.ages(found)]
    if kinds.told(found.explained.kinds) and not found.same:
        made.append(contributions.kinds(found))
    shown = tables_given((*made, tables.survivors(found)), found.this.loaded, found.that.loaded)
    this, that = (marks(found.holdings, side.of, side.loaded) for side in (found.this, found.that))
    both = {"this": this, "that": that}
    return tuple(marked(table, this.beside(that), both) for table in shown)


def _frame(found: Comparison) -> Frame:
    heading, question = found.heading, found.question
    both, asked = tables.pair(found), charts.asked(found, question.of)
    headline = None
    if found.moved is not None:
        label = _("Difference in {label}", label=names.inside(_(asked.indicator.label)))
        headline = Headline(
            label, asked.indicator.unit, float(asked.difference.value), found.moved.value
        )
    return frames.pinned(
        heading,
        question,
        title=names.first_capital(
            _("{this} against {that}", this=both.this.whole, that=both.that.whole)
        ),
        place=phrase(
            _("{this} against {that}"),
            this=_linked(found, question.this, both.this.whole),
            that=_linked(found, question.that, both.that.whole),
        ),
        figures=question.figures,
        settings=question.settings,
        notices=frames.notices(heading, question, found.moved, headline),
    )


def _linked(found: Comparison, of: PopulationYear, words: str) -> Piece:
    question = PopulationYearQuestion(of, found.question.figures, found.question.settings)
    heading = found.heading
    return Piece(words, address(heading.collection.code, heading.edition.number, question))


def _lead(found: Comparison) -> tuple[Sentence, ...]:
    said: list[Sentence] = []
    part, asked = found.explained.contributions.get("e0"), charts.asked(found, "e0")
    both = tables.pair(found)
    if found.same:
        return ()
    said.append(_seen(found))
    if found.question.of == "cdr":
        said.append(_crude(found))
    said.append(basis.standard(used(indicators.find(found.question.of), found.grid)))
    if part is not None and asked.clear:
        most = charts.most(found, part)
        named = found.question.of != "e0"
        said.append(ages_say.carried(*most, part.difference, named=named))
    said.append(say.evenness(both, charts.asked(found, "H")))
    return tuple(sentence for sentence in said if sentence)


def _seen(found: Comparison) -> Sentence:
    of = charts.asked(found, found.question.of)
    return kinds.could_be_seen(of.indicator, of.difference, found.settings)


def _ratios(found: Comparison) -> tuple[Sentence, ...]:
    of, parts = found.explained, []
    if found.same:
        return ()
    if of.unevenness is not None:
        parts.append(kinds.unevenness(of.unevenness.first, of.unevenness.second))
    if found.question.of != "cdr":
        parts.append(_crude(found))
    return tuple(part for part in parts if part)


def _crude(found: Comparison) -> Sentence:
    """What older or younger people make of the difference in crude rates."""
    of = found.explained.crude
    return () if of is None else kinds.crude(of.first, of.second)


def _not_parted(found: Comparison) -> tuple[Sentence, ...]:
    said, key = [], found.question.of
    if _why_not_parted(found):
        said.append(ages_say.not_parted(_why_not_parted(found)))
    if not decomposable(indicators.find(key)) and not found.same:
        one = indicators.find(key)
        why = decomposition.NOT_DECOMPOSED.get(key) or one.why_not_smooth
        said.append(ages_say.not_shared_out(one, _(why)))
    return tuple(said)


def _computed(found: Comparison) -> tuple[Sentence, ...]:
    path = phrase(
        "{name} {sentence}",
        name=Piece(_("Contributions."), emphasis="strong"),
        sentence=_(
            "They follow a straight line from one set of death rates to the other, so that they add"
            " up to the difference before rounding (Horiuchi, Wilmoth and Pletcher, 2008), with"
            " intervals by the delta method; of a figure that is not smooth, from replacing the"
            " counts age by age in both orders (Andreev, Shkolnikov and Begun, 2002), with 200"
            " simulated pairs. Arriaga’s formula stands beside them."
        ),
    )
    shared_out = sharing.computed(found.this.panel, found.that.panel)
    return (*basis.computed(found.settings), path, *shared_out)


def _moved_before(session: Session, found: Comparison) -> basis.Told:
    asked, sides = found.question, (found.this, found.that)
    any_ = any(side.loaded.status == "provisional" for side in sides)
    return provisional.caution(
        session, found.heading, found.holdings, asked.settings, asked.figures, any_=any_
    )


def _cautions(found: Comparison, moved_before: basis.Told) -> tuple[Caution, ...]:
    sides = (found.this, found.that)
    both = tables.pair(found)
    lived = {float(side.panel.exposure.sum()): side.of for side in sides}
    fewest = min(lived)
    years = {
        tables.named(found, side.of).period for side in sides if side.loaded.status == "provisional"
    }
    modelled = found.settings.open_interval != "one_over_m"
    return frames.cautions(
        beside=[
            caution(found.this.loaded, found.that.loaded),
            basis.provisional(sorted(years)),
            moved_before,
            basis.estimated(
                list(
                    dict.fromkeys(
                        tables.named(found, side.of).whole
                        for side in sides
                        if side.loaded.estimated
                    )
                )
            ),
            of_breaks.lies_between(
                found.holdings.parted(*_outer(found), found.this.of.area, found.that.of.area),
                *sorted((both.that.period, both.this.period)),
            ),
            *(
                of_breaks.mixed(found.mixed(side), tables.named(found, side.of).whole)
                for side in sides
            ),
            basis.few_person_years(
                fewest, found.settings, tables.named(found, lived[fewest]).whole
            ),
            *(
                basis.few_deaths(float(side.panel.deaths.sum()), tables.named(found, side.of).whole)
                for side in sides
                if few_deaths(indicators.INDICATORS["asr_esp2013"], side.panel.deaths)
            ),
            basis.law(found.settings, found.grid.open_age) if modelled else None,
            *(
                basis.borrowed(found.grid.open_age, _whole(found, side.of))
                for side in sides
                if side.borrowed
            ),
            basis.early_end(found.grid.open_age) if found.this.early_end else None,
            basis.smoothed(found.settings),
        ],
        below=[
            basis.safe_side(indicators.find(found.question.of), fewest),
            say.regrouped(
                [tables.named(found, of).whole for of in found.regrouped],
                _("{count} groups", count=len(found.grid)),
                found.grid.open_age,
            )
            if found.regrouped
            else None,
            say.counted_twice(tables.named(found, found.overlap).whole)
            if found.overlap and not found.same
            else None,
            (_("Not compared"), _why_not_parted(found)) if _why_not_parted(found) else None,
            ages_say.arithmetic() if both.this != both.that else None,
            *basis.reading(found.settings),
        ],
    )


def _outer(found: Comparison) -> tuple[str, str]:
    """The years compared, the earlier first; of years added up, the named ones."""
    first, last = sorted((found.this.of.period, found.that.of.period))
    return first, last


def _whole(found: Comparison, of: PopulationYear) -> str:
    """Name of the area that a side is part of; empty where there is none."""
    held = found.holdings
    parent = next((area.parent for area in held.areas if area.code == of.area), "")
    return held.name(parent) if parent else ""


def _why_not_parted(found: Comparison) -> str:
    """Why H has no contributions; empty where it has them, or nothing could differ."""
    if "H" in found.explained.contributions or found.same:
        return ""
    return reason(int(found.difference["H"].reason), found.settings)


def _further(found: Comparison) -> tuple[Sentence, ...]:
    heading, question = found.heading, found.question
    exchange = Piece(
        _("Exchange the two"),
        address(heading.collection.code, heading.edition.number, question.exchanged()),
    )
    return (
        *(
            phrase(
                _("{who}: the life table and its pictures"),
                who=_linked(found, of, names.first_capital(tables.named(found, of).whole)),
            )
            for of in dict.fromkeys((question.this, question.that))
        ),
        phrase(_("{exchange}: the same from the other side"), exchange=exchange),
    )


def _choice(found: Comparison) -> Choice:
    held, heading, question = found.holdings, found.heading, found.question
    return Choice(
        action=f"/c/{heading.collection.code}/{heading.edition.number}/{question.view}",
        offer=offer(held, found.settings.years),
        this=question.this,
        that=question.that,
        of=question.of,
        indicators=offered(question.of, compared=True),
        figures=question.figures,
        settings=question.settings,
    )
