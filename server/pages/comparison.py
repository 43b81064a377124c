"""What lies between these two? Any two population-years, wherever they stand."""

from dataclasses import dataclass
from typing import ClassVar

from engine import decomposition, indicators
from engine.standardisation import used
from server.charts.chart import Chart
from server.exports.table import Table
from server.pages import comparison_causes as causes
from server.pages import comparison_charts as charts
from server.pages import comparison_contributions as contributions
from server.pages import comparison_deaths as dying
from server.pages import comparison_even as even
from server.pages import comparison_rise as rising
from server.pages import comparison_tables as tables
from server.pages import frames
from server.pages.comparison_cautions import cautions, why_not_parted
from server.pages.comparison_ways import Choice, choice, further, notices, place
from server.pages.page import Frame, Page
from server.pages.statuses import Marks, marked, marks
from server.pages.withholding import charts_given, tables_given
from server.results.compared import Comparison, Side
from server.results.comparison import comparison
from server.results.explaining import decomposable
from server.results.questions import ComparisonQuestion
from server.sentences import basis, beside, care, kinds, names, sharing
from server.sentences import cause_contributions as causes_say
from server.sentences import causes as cause_words
from server.sentences import comparison as say
from server.sentences import contributions as ages_say
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.reasons import reason
from server.sentences.standing import Headline
from server.sentences.text import _
from server.store.connect import Session
from server.store.heading import Heading


@dataclass(frozen=True, slots=True, kw_only=True)
class ComparisonPage(Page):
    """The difference of every figure, and the ages it is made of."""

    template: ClassVar[str] = "comparison/page.html"
    drawn: frozenset[str]  # keys of the pictures there are
    groups: tuple[tuple[str, str], ...]  # further tables of figures, and what each is about
    not_parted: tuple[Sentence, ...]  # what has no picture of contributions, and why
    even: Sentence  # what early and late deaths add; empty where it is not known
    kinds: Sentence  # of change, from fitted laws; empty where none fits
    ratios: tuple[Sentence, ...]  # how a difference in unevenness comes about
    crude: Sentence  # how one in crude death rates does
    further: tuple[Sentence, ...]
    computed: tuple[Sentence, ...]
    basis: tuple[Sentence, ...]
    choice: Choice


def build(session: Session, heading: Heading, question: ComparisonQuestion) -> ComparisonPage:
    found = comparison(session, heading, question)
    drawn, made = _charts(found, frames.source(heading)), _tables(found)
    asked = charts.asked(found, question.of)
    return ComparisonPage(
        frame=_frame(found),
        answer=say.answer(
            tables.pair(found), asked, reason(int(asked.difference.reason), found.settings)
        ),
        lead=_lead(found),
        tables=made,
        charts=drawn,
        cautions=cautions(session, found),
        twins=frames.twins(heading, question),
        drawn=frozenset(chart.key for chart in drawn),
        groups=tuple((one.key, one.title) for one in made if one.key.startswith("figures-")),
        not_parted=_not_parted(found),
        kinds=() if found.same else kinds.told(found.explained.kinds),
        even=even.sentence(found),
        ratios=_ratios(found),
        crude=() if found.same or found.question.of == "cdr" else _crude(found),
        further=further(found),
        computed=_computed(found),
        basis=frames.basis(heading.edition.basis),
        choice=choice(found),
    )


def _charts(found: Comparison, source: str) -> tuple[Chart, ...]:
    """In the order of the page."""
    made = [charts.survivors, charts.asked_for, charts.life_expectancy]
    if not found.same:
        made = [charts.survivors, dying.ages_at_death, dying.ratios, *made[1:], rising.rise]
    drawn = [draw(found, source) for draw in (*made, charts.unevenness)]
    drawn += causes.charts(found, source)
    return charts_given(
        (chart for chart in drawn if chart is not None), found.this.loaded, found.that.loaded
    )


def _tables(found: Comparison) -> tuple[Table, ...]:
    made = [tables.figures(found), *tables.further(found)]
    if found.explained.contributions and not found.same:
        made += [contributions.groups(found), contributions.ages(found)]
    if not found.same:
        made += [dying.deaths_table(found), dying.ratio_table(found), rising.rise_table(found)]
        made += [table for table in (even.table(found),) if table is not None]
        made += causes.tables(found)
    if kinds.told(found.explained.kinds) and not found.same:
        made.append(contributions.kinds(found))
    shown = tables_given((*made, tables.survivors(found)), found.this.loaded, found.that.loaded)
    this, that = (_marks(side) for side in (found.this, found.that))
    both = {"this": this, "that": that}
    return tuple(marked(table, this.beside(that), both) for table in shown)


def _marks(side: Side) -> Marks:
    """A printed table has none."""
    if side.place.standard:
        return Marks("", "")
    return marks(side.place.holdings, side.of, side.loaded)


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
        place=place(found),
        figures=question.figures,
        settings=question.settings,
        notices=(*frames.notices(heading, question, found.moved, headline), *notices(found)),
    )


def _lead(found: Comparison) -> tuple[Sentence, ...]:
    said: list[Sentence] = []
    part, asked = found.explained.contributions.get("e0"), charts.asked(found, "e0")
    both = tables.pair(found)
    if found.same:
        return ()
    said.append(_seen(found))
    said.append(_rest(found))
    if found.question.of == "cdr":
        said.append(_crude(found))
    said.append(basis.standard(used(indicators.find(found.question.of), found.grid)))
    if part is not None and asked.clear:
        most = charts.most(found, part)
        named = found.question.of != "e0"
        said.append(ages_say.carried(*most, part.difference, named=named))
    said.append(causes.sentence(found))
    said.append(cause_words.external(one.label for one in causes.named(found)))
    said.append(_care(found))
    said.append(say.evenness(both, charts.asked(found, "H")))
    return tuple(sentence for sentence in said if sentence)


def _care(found: Comparison) -> Sentence:
    """Where readers find help, where a cause that asks for it is named."""
    of = causes.parts(found)
    return () if of is None else care.told(of.list)


def _rest(found: Comparison) -> Sentence:
    """What the rest of a whole is, where one side is such."""
    rest = next((side.place.rest for side in (found.this, found.that) if side.place.rest), None)
    if rest is None:
        return ()
    held = found.holdings
    return beside.rest(held.name(rest.whole.area), held.name(rest.without))


def _seen(found: Comparison) -> Sentence:
    of = charts.asked(found, found.question.of)
    return kinds.could_be_seen(of.indicator, of.difference, found.settings)


def _ratios(found: Comparison) -> tuple[Sentence, ...]:
    of, parts = found.explained, []
    if found.same:
        return ()
    if of.unevenness is not None:
        parts.append(kinds.unevenness(of.unevenness.first, of.unevenness.second))
    return tuple(part for part in parts if part)


def _crude(found: Comparison) -> Sentence:
    """What older or younger people make of the difference in crude rates."""
    of = found.explained.crude
    return () if of is None or found.kind == "standard" else kinds.crude(of.first, of.second)


def _not_parted(found: Comparison) -> tuple[Sentence, ...]:
    said, key = [], found.question.of
    if why_not_parted(found):
        said.append(ages_say.not_parted(why_not_parted(found)))
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
    return (*basis.computed(found.settings), path, *_of_causes(found), *shared_out)


def _of_causes(found: Comparison) -> tuple[Sentence, ...]:
    asked, of = found.question.causes, found.explained.causes
    if of is None or asked is None:
        return ()
    treated = causes_say.treated(
        spread=asked.ill_defined == "spread",
        undetermined=asked.undetermined == "spread",
        applied=len(of.ratios),
    )
    return (treated,)
