"""Which way is it going? One indicator through the years, for chosen areas and sexes."""

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from engine.estimates import Reason
from engine.settings import span
from server.pages import frames, provisional, trend_chart
from server.pages import trend_tables as tables
from server.pages.choices import Grouped, Offer, indicators, offer
from server.pages.page import Caution, Page
from server.results.courses import Course
from server.results.questions import (
    DEFAULT_INDICATOR,
    ComparisonQuestion,
    PopulationYear,
    PopulationYearQuestion,
    TrendQuestion,
    address,
)
from server.results.series import Series, series
from server.sentences import basis, kinds, names, withholding
from server.sentences import breaks as of_breaks
from server.sentences import trend as say
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.reasons import reason
from server.sentences.standing import Headline
from server.sentences.text import _
from server.store.connect import Session
from server.store.heading import Heading

SAID = 5  # lines beside the first that the lead speaks of


@dataclass(frozen=True, slots=True)
class Choice:
    """The form above the picture: what there is, and what is chosen."""

    action: str
    offer: Offer
    indicators: Grouped
    asked: TrendQuestion


@dataclass(frozen=True, slots=True, kw_only=True)
class TrendPage(Page):
    """One indicator through time."""

    template: ClassVar[str] = "trend/page.html"
    out_of_band: ClassVar[tuple[str, ...]] = ("areas", "sexes")  # none chosen: the page chooses
    drawn: bool
    broken: bool  # a break or a year of shock lies among its years
    choice: Choice
    computed: tuple[Sentence, ...]
    basis: tuple[Sentence, ...]
    further: tuple[Sentence, ...]


def build(session: Session, heading: Heading, question: TrendQuestion) -> TrendPage:
    found = series(session, heading, question)
    label, brief = _(found.indicator.label), _(names.brief(found.indicator.label))
    courses = [course(found, one) for one in found.courses]
    told = [one for one in courses if one is not None]
    area, sex = found.lines[0]
    chart = trend_chart.draw(found, say.finding(brief, told), frames.source(heading))
    lead = [say.meaning(question.of)]
    if not found.indicator.needs.whole:  # of those no two compare
        if courses[0]:
            change = courses[0].change
            lead.append(kinds.could_be_seen(found.indicator, change, found.settings))
            lead.append(say.halves(courses[0]))
        lead.append(say.others([one for one in courses[1 : 1 + SAID] if one]))
        lead += _broken(found)
    return TrendPage(
        frame=frames.pinned(
            heading,
            question,
            title=_("{label}, trend", label=label),
            place=phrase(
                _("{label}, {first} to {last}"),
                label=names.inside(label),
                first=found.periods[0],
                last=found.periods[-1],
            ),
            figures=question.figures,
            settings=question.settings,
            notices=frames.notices(heading, question, found.moved, _headline(found)),
        ),
        answer=say.answer(courses[0], brief, names.population(sex, found.holdings.name(area))),
        lead=tuple(sentence for sentence in lead if sentence),
        tables=(tables.years(found), tables.estimates(found), *tables.breaks(found)),
        charts=(chart,) if chart else (),
        cautions=_cautions(found, _moved_before(session, found)),
        twins=frames.twins(heading, question),
        drawn=chart is not None,
        broken=bool(found.broken),
        choice=_choice(found),
        computed=(
            phrase(
                _("{name} {definition} Source: {source}."),
                name=Piece(f"{label}.", emphasis="strong"),
                definition=_(found.indicator.definition),
                source=found.indicator.source,
            ),
            *basis.computed(found.settings),
        ),
        basis=frames.basis(heading.edition.basis),
        further=_further(found, courses),
    )


def course(found: Series, of: Course) -> say.Course | None:
    """How a line ran between breaks; None where it has fewer than two values."""
    ends, line = of.run.ends, of.run.line
    if ends is None:
        return None
    first, last = (found.estimate[line, found.periods.index(end)] for end in ends)
    area, sex = found.lines[line]
    return say.Course(
        found.indicator,
        sex,
        found.holdings.name(area),
        _years(found, ends[0]),
        _years(found, ends[1]),
        first,
        last,
        of.change,
        of.run.middle and _years(found, of.run.middle),
        of.earlier,
        of.later,
    )


def _broken(found: Series) -> list[Sentence]:
    """Where the lines stop, what changed before that, and which years are not measured from."""
    parting = [one for one in found.broken if one.kind != "shock"]
    if not found.broken:
        return []
    told = [one for part in found.before[-SAID:] if (one := course(found, part))]
    said = [of_breaks.before(one.who, one.first, one.last, say.moved(one)) for one in told]
    left_out = sorted({one.period for one in found.broken if one.kind == "shock"})
    return [
        of_breaks.parted(parting) if parting else (),
        of_breaks.before_all(said),
        of_breaks.left_out(left_out),
    ]


def _years(found: Series, period: str) -> str:
    """The year, or the years added up."""
    return names.years(span(period, found.settings.years))


def _further(found: Series, courses: list[say.Course | None]) -> tuple[Sentence, ...]:
    """For the first lines: the comparison of their ends, and the life table of the last year."""
    asked, heading = found.question, found.heading
    of = DEFAULT_INDICATOR if found.indicator.needs.whole else asked.of
    place = (heading.collection.code, heading.edition.number)
    changes, lives = [], []
    for line, ends, one in zip(found.lines[: SAID + 1], found.ends, courses, strict=False):
        if one is None or ends is None:
            continue
        first, last = (PopulationYear(*line, period) for period in ends)
        compared = ComparisonQuestion(last, first, of, asked.figures, asked.settings)
        lived = PopulationYearQuestion(last, asked.figures, asked.settings)
        words = _("{who}, {last} against {first}", who=one.who, last=one.last, first=one.first)
        changes.append(Piece(words, address(*place, compared)))
        words = _("{who} in {year}", who=one.who, year=one.last)
        lives.append(Piece(words, address(*place, lived)))
    return say.further(changes, lives)


def _headline(found: Series) -> Headline:
    """The figure by which a newer edition is measured: the first line's newest."""
    year = found.headline.period
    label = _(
        "{label} of {who} in {year}",
        label=_(found.indicator.label),
        who=_who(found, 0),
        year=_years(found, year),
    )
    here = found.estimate.value[0, found.periods.index(year)]
    there = found.moved.value if found.moved else np.nan
    return Headline(label, found.indicator.unit, float(here), there)


def _moved_before(session: Session, found: Series) -> basis.Told:
    asked, any_ = found.question, any("provisional" in status for status in found.status)
    held = found.holdings
    return provisional.caution(
        session, found.heading, held, asked.settings, asked.figures, any_=any_
    )


def _cautions(found: Series, moved_before: basis.Told) -> tuple[Caution, ...]:
    years = {
        period
        for status in found.status
        for period, one in zip(found.periods, status, strict=True)
        if one == "provisional"
    }
    small = [
        _who(found, line)
        for line in range(len(found.lines))
        if not found.indicator.needs.whole
        and tables.widest(found.estimate, line) > abs(float(found.change.value[line]))
    ]
    withheld = [
        _who(found, line)
        for line, some in enumerate(zip(found.protected, found.rounded, strict=True))
        if any(hidden and not base for hidden, base in zip(*some, strict=True))
    ]
    base = max(base for line in found.rounded for base in line)
    return frames.cautions(
        beside=[
            withholding.behind(withheld),
            withholding.rounded(base) if base else None,
            basis.provisional(sorted(years)),
            moved_before,
            basis.estimated(
                [_who(found, line) for line, some in enumerate(found.estimated) if some]
            ),
            basis.pooled(found.settings),
            basis.smoothed(found.settings),
            say.no_two(found.indicator),
            say.small(small),
            say.few_deaths([_who(found, line) for line, few in enumerate(found.few_deaths) if few]),
            *_missing(found),
        ],
        below=(
            basis.safe_side(found.indicator, found.fewest),
            *basis.reading(found.settings),
        ),
    )


def _missing(found: Series) -> list[basis.Told]:
    """Why points are missing, once for each reason."""
    lines: dict[int, list[str]] = {}
    for line in range(len(found.lines)):
        gone = found.estimate.reason[line][~np.isfinite(found.estimate.value[line])]
        for code in sorted(set(gone.tolist()) - {int(Reason.NONE)}):
            lines.setdefault(code, []).append(_who(found, line))
    return [say.missing(who, reason(code, found.settings)) for code, who in lines.items()]


def _who(found: Series, line: int) -> str:
    area, sex = found.lines[line]
    return names.population(sex, found.holdings.name(area))


def _choice(found: Series) -> Choice:
    heading = found.heading
    return Choice(
        action=f"/c/{heading.collection.code}/{heading.edition.number}/{found.question.view}",
        offer=offer(found.holdings),
        indicators=indicators(found.indicator.key),
        asked=found.question,
    )
