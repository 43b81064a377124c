"""Where would closing the gap to a benchmark add most? One area, sex and year."""

from dataclasses import dataclass
from typing import ClassVar

from server.charts.chart import Chart
from server.exports.table import Table
from server.pages import cause_choices, frames
from server.pages import gaps_tables as tables
from server.pages.choices import Choice, Options, choice
from server.pages.page import Caution, Page
from server.pages.statuses import marked, marks
from server.pages.what_would_change import back, frame, moved_before
from server.pages.withholding import caution, charts_given, tables_given
from server.results.gaps import LEAST, Closed, Gaps, GapsQuestion, gaps_of
from server.sentences import basis, breaks, care, causes, names, sharing
from server.sentences import gaps as say
from server.sentences.numbers import whole
from server.sentences.pieces import Sentence
from server.sentences.reasons import reason
from server.sentences.text import _
from server.store.connect import Session
from server.store.heading import Heading


@dataclass(frozen=True, slots=True, kw_only=True)
class GapsPage(Page):
    """What each age and cause would add with a benchmark's death rates."""

    template: ClassVar[str] = "gaps/page.html"
    drawn: frozenset[str]  # keys of the pictures there are
    closed: bool  # whether there is a benchmark at all
    by_cause: bool  # then the table has hundreds of rows, and is folded
    choice: Choice
    least: str  # person-years that an area of the benchmark has at least
    sizes: Options
    how: tuple[cause_choices.CauseLine, ...]  # causes are shown
    computed: tuple[Sentence, ...]
    basis: tuple[Sentence, ...]
    further: tuple[Sentence, ...]


def build(session: Session, heading: Heading, question: GapsQuestion) -> GapsPage:
    found = gaps_of(session, heading, question)
    drawn = _charts(found, frames.source(heading))
    return GapsPage(
        frame=frame(
            found,
            _("{who}, {year}: where closing the gap adds most"),
            _("{who}: where closing the gap adds most"),
        ),
        answer=_answer(found),
        lead=_lead(found),
        tables=_tables(found),
        charts=drawn,
        cautions=_cautions(
            found,
            moved_before(
                session, found, any_=any(one.status == "provisional" for one in found.protected)
            ),
        ),
        twins=frames.twins(heading, question),
        drawn=frozenset(one.key for one in drawn),
        closed=found.closed is not None,
        by_cause=found.closed is not None and bool(found.closed.causes),
        choice=choice(heading, found.holdings, question),
        least=question.least,
        sizes=tuple((size, whole(float(size))) for size in LEAST),
        how=cause_choices.lines(question.causes),
        computed=_computed(found),
        basis=frames.basis(heading.edition.basis),
        further=_further(found),
    )


def _who(found: Gaps) -> str:
    return names.population(found.of.sex, found.name)


def _answer(found: Gaps) -> Sentence:
    closed = found.closed
    if closed is None:
        why = reason(int(found.e0.reason), found.settings)
        known = say.no_benchmark(found.question.least) if not found.chosen.members else why
        return say.no_answer(_who(found), found.period, known)
    told = tables.clear(found)
    clear = [
        say.Gap(*named, tables.gain(found, at))
        for named, at in zip(_named(found), told, strict=True)
    ]
    return say.answer(_who(found), found.period, clear, _together(closed))


def _named(found: Gaps) -> list[tuple[str, str]]:
    """Ages and cause of the clear gaps, the largest first."""
    known = tables.places(found)
    return [known[at] for at in tables.clear(found)]


def _together(closed: Closed) -> say.Together:
    return say.Together(
        float(closed.together.change["e0"].value),
        float(closed.alike.total),
        float(closed.alike.total_most),
    )


def _lead(found: Gaps) -> tuple[Sentence, ...]:
    closed = found.closed
    if closed is None:
        return ()
    said = [
        care.told(closed.causes),
        causes.external(cause for _ages, cause in _named(found)),
        say.benchmark(
            [found.holdings.name(area) for area in found.chosen.members],
            found.chosen.years,
            found.question.least,
            int((found.chosen.lived >= float(found.question.least)).sum()),
        ),
    ]
    for at in tables.clear(found)[:1]:
        uneven = closed.numbers.change["H"][at]
        said.append(
            say.unevenness(*(1000 * float(one) for one in (uneven.value, uneven.low, uneven.high)))
        )
        said.append(say.all_together(_together(closed), float(closed.alike.largest)))
    return tuple(sentence for sentence in said if sentence)


def _tables(found: Gaps) -> tuple[Table, ...]:
    made = [tables.cells(found)] if found.closed else []
    made.append(tables.candidates(found))
    own = marks(found.holdings, found.of, found.loaded)
    return tuple(marked(table, own) for table in tables_given(made, *found.protected))


def _charts(found: Gaps, source: str) -> tuple[Chart, ...]:
    made = tables.chart(found, source) if found.closed else None
    return charts_given([made] if made else [], *found.protected)


def _computed(found: Gaps) -> tuple[Sentence, ...]:
    closed = found.closed
    own = say.computed(closed.compared, closed.excess.size) if closed else ()
    return (*basis.computed(found.settings), *own, *sharing.computed(found.loaded.panel))


def _cautions(found: Gaps, moved_before: basis.Told) -> tuple[Caution, ...]:
    panel, settings = found.loaded.panel, found.settings
    provisional_ = any(one.status == "provisional" for one in found.protected)
    estimated = any(one.estimated for one in found.protected)
    modelled = settings.open_interval != "one_over_m"
    early = not modelled and panel.grid.open_age < settings.sound_open_age
    return frames.cautions(
        beside=[
            caution(*found.protected),
            basis.provisional([found.period] if provisional_ else []),
            moved_before,
            basis.estimated([_who(found)] if estimated else []),
            breaks.mixed(found.holdings.mixed(found.of, settings.years), _who(found)),
            basis.few_person_years(float(panel.exposure.sum()), settings),
            basis.law(settings, panel.grid.open_age) if modelled else None,
            basis.smoothed(settings),
            basis.early_end(panel.grid.open_age) if early else None,
        ],
        below=[
            say.arithmetic(),
            say.chance(),
            say.member() if found.own_benchmark else None,
            *basis.reading(settings),
        ],
    )


def _further(found: Gaps) -> tuple[Sentence, ...]:
    asked = found.question
    own = (found.heading, asked.of, asked.figures, asked.settings)
    return back(*own, but=GapsQuestion, causes=asked.causes)
