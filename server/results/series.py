"""One indicator through the years, for chosen areas and sexes: the trend's numbers."""

from dataclasses import dataclass
from typing import NamedTuple, TypeVar

import numpy as np
from numpy.typing import NDArray

from engine import indicators
from engine import settings as named
from engine.ages import AgeGrid
from engine.estimates import Estimate, Reason
from engine.indicators import Indicator
from engine.panel import Panel
from engine.settings import Settings
from server.results.estimating import stream
from server.results.loading import Holdings, Loaded, NotInEdition, holdings, load
from server.results.questions import PopulationYear, TrendQuestion
from server.results.revision import Moved, moved
from server.sentences.numbers import whole
from server.sentences.text import _
from server.store.connect import Session
from server.store.heading import Heading

T = TypeVar("T")

MOST = 5_000  # population-years a question may ask for
MOST_SIMULATED = 200  # where every one is simulated some hundred times: about ten seconds


class TooLarge(ValueError):
    """A question above the cap (422); its text says the limit and how to ask for less."""


@dataclass(frozen=True, slots=True)
class Series:
    """Estimates [line, period]; a line is an area and sex."""

    heading: Heading
    holdings: Holdings
    question: TrendQuestion
    settings: Settings
    indicator: Indicator
    lines: tuple[tuple[str, str], ...]  # in the tree order of their areas
    periods: tuple[str, ...]
    estimate: Estimate
    status: tuple[tuple[str, ...], ...]  # [line][period]: final, provisional; "" where not held
    open_ages: tuple[tuple[int | None, ...], ...]  # [line][period]: where the table ends
    ends: tuple[tuple[str, str] | None, ...]  # [line]: first and last year with a value
    change: Estimate  # [line]: value at the last of `ends` less that at the first
    middle: tuple[str, ...]  # [line]: the year with a value in the middle of them; "" where none
    earlier: Estimate  # [line]: the change up to the middle year
    later: Estimate  # [line]: the change from it on
    moved: Moved | None  # the first line's last figure in a newer edition


def series(session: Session, heading: Heading, question: TrendQuestion) -> Series:
    """All lines and years of a completed question: three statements, one engine call a grid; two
    more statements where a newer edition stands.

    Raises: NotInEdition where nothing asked for is held; TooLarge.
    """
    held = holdings(session, heading.collection.code, heading.edition.number)
    settings, indicator = named.find(question.settings), indicators.find(question.of)
    lines, periods = _in_tree_order(held, question), _periods(held, question)
    wanted = [PopulationYear(*line, period) for line in lines for period in periods]
    _require(held, question, wanted, indicator)
    loaded = load(session, heading.collection.code, heading.edition.number, wanted)
    collection = heading.collection.code
    estimate = _by_grid(collection, wanted, loaded, indicator, settings)[
        np.arange(len(wanted)).reshape(len(lines), len(periods))
    ]
    ends = tuple(_ends(row, periods) for row in estimate.value)
    middle = tuple(_middle(row, periods) for row in estimate.value)
    spans = _spans(ends, middle)
    found = [loaded.get(one) for one in wanted]
    return Series(
        heading=heading,
        holdings=held,
        question=question,
        settings=settings,
        indicator=indicator,
        lines=lines,
        periods=periods,
        estimate=estimate,
        status=_rows([one.status if one else "" for one in found], len(periods)),
        open_ages=_rows([one.panel.grid.open_age if one else None for one in found], len(periods)),
        ends=ends,
        middle=middle,
        change=_changes(collection, lines, spans.whole, loaded, indicator, settings),
        earlier=_changes(collection, lines, spans.earlier, loaded, indicator, settings),
        later=_changes(collection, lines, spans.later, loaded, indicator, settings),
        moved=_moved(session, heading, lines[0], ends[0], indicator, settings),
    )


def _in_tree_order(held: Holdings, question: TrendQuestion) -> tuple[tuple[str, str], ...]:
    """The whole before its parts, whatever their codes; areas not held last."""
    order = {area.code: at for at, area in enumerate(held.areas)}
    return tuple(sorted(question.series, key=lambda line: order.get(line[0], len(order))))


def _periods(held: Holdings, question: TrendQuestion) -> tuple[str, ...]:
    return tuple(period for period in held.periods if question.first <= period <= question.last)


def _require(
    held: Holdings,
    question: TrendQuestion,
    wanted: list[PopulationYear],
    indicator: Indicator,
) -> None:
    for area in question.areas:
        held.require_area(area)
    if not any(one in held.status for one in wanted):
        raise NotInEdition(
            _(
                "This edition holds nothing for these areas and sexes from {first} to {last}. Its"
                " years are {start} to {end}.",
                first=question.first,
                last=question.last,
                start=held.periods[0] if held.periods else _("none"),
                end=held.periods[-1] if held.periods else _("none"),
            )
        )
    limit = MOST if indicator.smooth else MOST_SIMULATED
    if len(wanted) > limit:
        raise TooLarge(
            _(
                "This asks for {asked} areas, sexes and years of {label}; a page draws at most"
                " {limit}. Choose fewer areas or a shorter span of years.",
                asked=whole(len(wanted)),
                label=_(indicator.label),
                limit=whole(limit),
            )
        )


def _by_grid(
    collection: str,
    wanted: list[PopulationYear],
    loaded: dict[PopulationYear, Loaded],
    indicator: Indicator,
    settings: Settings,
) -> Estimate:
    """One estimate a population-year, [wanted]; those not held say so."""
    count = len(wanted)
    values, lows, highs = (np.full(count, np.nan) for _part in range(3))
    reasons = np.full(count, Reason.NOT_AVAILABLE, np.uint8)
    places: dict[AgeGrid, list[int]] = {}
    for index, one in enumerate(wanted):
        if one in loaded:
            places.setdefault(loaded[one].panel.grid, []).append(index)
    for indexes in places.values():
        panel = Panel.stack([loaded[wanted[index]].panel for index in indexes])
        codes = np.stack([stream(collection, wanted[index]) for index in indexes])
        part = indicators.estimate(indicator, panel, settings, streams=codes)
        values[indexes], lows[indexes], highs[indexes] = part.value, part.low, part.high
        reasons[indexes] = part.reason
    return Estimate(values, lows, highs, reasons)


def _ends(values: NDArray[np.float64], periods: tuple[str, ...]) -> tuple[str, str] | None:
    known = np.flatnonzero(np.isfinite(values))
    if len(known) < 2:
        return None
    return periods[known[0]], periods[known[-1]]


def _moved(
    session: Session,
    heading: Heading,
    line: tuple[str, str],
    ends: tuple[str, str] | None,
    indicator: Indicator,
    settings: Settings,
) -> Moved | None:
    if ends is None:
        return None
    one = PopulationYear(*line, ends[1])
    return moved(
        session,
        heading,
        [one],
        lambda newer: float(indicators.estimate(indicator, newer[one].panel, settings).value),
    )


def _middle(values: NDArray[np.float64], periods: tuple[str, ...]) -> str:
    known = np.flatnonzero(np.isfinite(values))
    if len(known) < 5:  # fewer years have no halves worth telling apart
        return ""
    centre = (known[0] + known[-1]) / 2
    return periods[int(known[np.argmin(np.abs(known - centre))])]


class _Spans(NamedTuple):
    """First and last year of each line's whole run and of its halves, [line]; None where none."""

    whole: tuple[tuple[str, str] | None, ...]
    earlier: tuple[tuple[str, str] | None, ...]
    later: tuple[tuple[str, str] | None, ...]


def _spans(ends: tuple[tuple[str, str] | None, ...], middle: tuple[str, ...]) -> _Spans:
    pairs = list(zip(ends, middle, strict=True))
    return _Spans(
        ends,
        tuple((end[0], turn) if end and turn else None for end, turn in pairs),
        tuple((turn, end[1]) if end and turn else None for end, turn in pairs),
    )


def _changes(
    collection: str,
    lines: tuple[tuple[str, str], ...],
    ends: tuple[tuple[str, str] | None, ...],
    loaded: dict[PopulationYear, Loaded],
    indicator: Indicator,
    settings: Settings,
) -> Estimate:
    """The last year of a span less the first, [line], each pair on the grid it shares."""
    gap = np.full(len(lines), np.nan)
    out = Estimate(gap, gap.copy(), gap.copy(), np.full(len(lines), Reason.NOT_AVAILABLE, np.uint8))
    for index, (line, pair) in enumerate(zip(lines, ends, strict=True)):
        if pair is None:
            continue
        first, last = (PopulationYear(*line, period) for period in pair)
        this, that = loaded[last].panel, loaded[first].panel
        grid = this.grid.common(that.grid)
        part = indicators.difference(
            indicator,
            this.regroup(grid),
            that.regroup(grid),
            settings,
            streams=(stream(collection, last), stream(collection, first)),
        )
        out.value[index], out.low[index], out.high[index] = part.value, part.low, part.high
        out.reason[index] = part.reason
    return out


def _rows(flat: list[T], width: int) -> tuple[tuple[T, ...], ...]:
    return tuple(tuple(flat[at : at + width]) for at in range(0, len(flat), width))
