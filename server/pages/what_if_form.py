"""The plain form of a what-if page: one line for each change, and lines left blank for more."""

from dataclasses import dataclass

from server.pages import cause_choices
from server.pages.choices import Grouped, Offer, Options, indicators, offer
from server.results.what_if import Findings
from server.results.what_if_question import MOST_ROWS, Where
from server.sentences import names
from server.sentences.text import _

LEAST_LINES = 2


@dataclass(frozen=True, slots=True)
class Line:
    """One change as the form shows it."""

    number: int
    legend: str
    by: str
    where: Where
    sex: str


@dataclass(frozen=True, slots=True)
class Form:
    """Everything a plain GET form needs to spell the address."""

    action: str
    offer: Offer
    indicators: Grouped
    lines: tuple[Line, ...]
    firsts: Options  # ages at which a change may begin
    lasts: Options  # and end
    sexes: Options  # of whom; none where the population is of one sex
    causes: Options  # none where there are no causes
    how: tuple[cause_choices.CauseLine, ...]  # causes are shown
    benchmarks: Options  # areas whose rates may stand in, and none


def form(found: Findings) -> Form:
    question, heading = found.question, found.heading
    rows = question.rows
    count = min(max(LEAST_LINES, len(rows) + 1), MOST_ROWS)
    lines = tuple(
        Line(
            number,
            _("Change {number}", number=number),
            rows[number - 1].by if number <= len(rows) else "",
            rows[number - 1].where if number <= len(rows) else Where(),
            rows[number - 1].sex if number <= len(rows) else "p",
        )
        for number in range(1, count + 1)
    )
    starts = found.grid.starts
    offered = offer(found.holdings, found.settings.years)
    apart = {"f", "m"} <= set(found.changed.own.parts.sexes)
    return Form(
        action=f"/c/{heading.collection.code}/{heading.edition.number}/{question.view}",
        offer=offered,
        indicators=indicators(question.of),
        lines=lines,
        firsts=tuple((str(start), str(start)) for start in starts),
        lasts=(
            ("", _("and over")),
            *((str(start - 1), str(start - 1)) for start in starts[1:]),
        ),
        sexes=tuple((sex, names.sex(sex)) for sex in ("p", "f", "m")) if apart else (),
        causes=cause_choices.offered(found.changed.own.causes),
        how=cause_choices.lines(question.causes),
        benchmarks=(("", _("none")), *offered.areas),
    )
