"""One indicator through the years, for chosen areas and sexes: the trend's numbers."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from engine import indicators
from engine import settings as named
from engine.ages import AgeGrid
from engine.estimates import Estimate, Reason
from engine.indicators import Indicator
from engine.panel import Panel
from engine.settings import Settings, span
from engine.standardisation import few_deaths
from server.results.estimating import stream
from server.results.loading import (
    Beside,
    Found,
    Holdings,
    Loaded,
    NotInEdition,
    Shared,
    holdings,
    load,
    overlap,
    shared_part,
)
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
    fewest: float  # person-years of the smallest population drawn
    few_deaths: tuple[bool, ...]  # [line]: some year's standardised rate rests on few of them
    headline: PopulationYear  # the first line's newest figure, by which a newer edition is measured
    moved: Moved | None


def series(session: Session, heading: Heading, question: TrendQuestion) -> Series:
    """All lines and years of a completed question: three statements, one engine call a grid; two
    more statements where a newer edition stands.

    Raises: NotInEdition where nothing asked for is held; TooLarge.
    """
    held = holdings(session, heading.collection.code, heading.edition.number)
    settings, indicator = named.find(question.settings), indicators.find(question.of)
    lines, periods = _in_tree_order(held, question), _periods(held, question, settings.years)
    wanted = [PopulationYear(*line, period) for line in lines for period in periods]
    _require(held, question, wanted, indicator)
    collection, number = heading.collection.code, heading.edition.number
    beside = Beside.of(settings, held.areas, indicator)
    loaded = load(session, collection, number, wanted, beside)
    estimate = _by_grid(collection, wanted, loaded, indicator, settings)[
        np.arange(len(wanted)).reshape(len(lines), len(periods))
    ]
    ends = tuple(_ends(row, periods) for row in estimate.value)
    middle = tuple(_middle(row, periods) for row in estimate.value)
    asked = _asked(lines, _spans(ends, middle), settings.years)
    overlaps = {one.shared for one in asked if one and one.shared}
    loaded |= load(session, collection, number, overlaps) if overlaps else {}
    changes = _changes(collection, asked, loaded, indicator, settings)[
        np.arange(len(asked)).reshape(3, len(lines))
    ]
    found = [loaded.get(one) for one in wanted]
    headline = PopulationYear(*lines[0], _newest(estimate.value[0], periods))
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
        change=changes[0],
        earlier=changes[1],
        later=changes[2],
        few_deaths=tuple(
            any(one is not None and few_deaths(indicator, one.panel.deaths) for one in row)
            for row in _rows(found, len(periods))
        ),
        fewest=min((float(one.panel.exposure.sum()) for one in found if one), default=np.nan),
        headline=headline,
        moved=moved(
            session,
            heading,
            [headline],
            beside,
            lambda newer: _figure(newer.get(headline), indicator, settings),
        ),
    )


def _in_tree_order(held: Holdings, question: TrendQuestion) -> tuple[tuple[str, str], ...]:
    """The whole before its parts, whatever their codes; areas not held last."""
    order = {area.code: at for at, area in enumerate(held.areas)}
    return tuple(sorted(question.series, key=lambda line: order.get(line[0], len(order))))


def _periods(held: Holdings, question: TrendQuestion, years: int) -> tuple[str, ...]:
    """The years asked for; of years added up those before which enough are held, if there are."""
    asked = [period for period in held.periods if question.first <= period <= question.last]
    pooled = [one for one in asked if set(span(one, years)) <= set(held.periods)]
    return tuple(pooled or asked)


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
    loaded: Found,
    indicator: Indicator,
    settings: Settings,
) -> Estimate:
    """One estimate a population-year, [wanted]; those not held say so."""

    def read(grid: AgeGrid, places: list[int]) -> Estimate:
        ones = [wanted[at] for at in places]
        panel, codes = _stacked(ones, loaded, grid), _codes(collection, ones)
        return indicators.estimate(indicator, panel, settings, streams=codes)

    grids = [loaded[one].panel.grid if one in loaded else None for one in wanted]
    return _scattered(grids, read)


def _stacked(ones: Sequence[PopulationYear], loaded: Found, grid: AgeGrid) -> Panel:
    return Panel.stack([loaded[one].panel.regroup(grid) for one in ones])


def _codes(collection: str, ones: Sequence[PopulationYear]) -> NDArray[np.str_]:
    return np.stack([stream(collection, one) for one in ones])


def _scattered(
    grids: list[AgeGrid | None], read: Callable[[AgeGrid, list[int]], Estimate]
) -> Estimate:
    """What is read of the places of each grid in one call, put where it belongs; the places without
    a grid say that nothing is held."""
    places: dict[AgeGrid, list[int]] = {}
    for place, own in enumerate(grids):
        if own is not None:
            places.setdefault(own, []).append(place)
    value, low, high, se = (np.full(len(grids), np.nan) for _part in range(4))
    reason = np.full(len(grids), Reason.NOT_AVAILABLE, np.uint8)
    for grid, at in places.items():
        part = read(grid, at)
        value[at], low[at], high[at], se[at] = part.value, part.low, part.high, part.se
        reason[at] = part.reason
    return Estimate(value, low, high, reason, se)


def _ends(values: NDArray[np.float64], periods: tuple[str, ...]) -> tuple[str, str] | None:
    known = np.flatnonzero(np.isfinite(values))
    if len(known) < 2:
        return None
    return periods[known[0]], periods[known[-1]]


def _newest(values: NDArray[np.float64], periods: tuple[str, ...]) -> str:
    """The last year with a value; the last year of all where none has one."""
    known = np.flatnonzero(np.isfinite(values))
    return periods[known[-1]] if len(known) else periods[-1]


def _figure(loaded: Loaded | None, indicator: Indicator, settings: Settings) -> float:
    if loaded is None:
        return np.nan
    return float(indicators.estimate(indicator, loaded.panel, settings).value)


def _middle(values: NDArray[np.float64], periods: tuple[str, ...]) -> str:
    known = np.flatnonzero(np.isfinite(values))
    if len(known) < 5:  # fewer years have no halves worth telling apart
        return ""
    years = np.array([int(periods[at]) for at in known])
    return periods[int(known[np.argmin(np.abs(years - (years[0] + years[-1]) / 2))])]


Span = tuple[str, str] | None  # first and last year; None where there is none


def _spans(ends: tuple[Span, ...], middle: tuple[str, ...]) -> tuple[tuple[Span, ...], ...]:
    """Of each line's whole run, of its earlier and of its later half: [3][line]."""
    pairs = list(zip(ends, middle, strict=True))
    return (
        ends,
        tuple((end[0], turn) if end and turn else None for end, turn in pairs),
        tuple((turn, end[1]) if end and turn else None for end, turn in pairs),
    )


@dataclass(frozen=True, slots=True)
class _Change:
    """Two years of a line, and the years that both pool."""

    last: PopulationYear
    first: PopulationYear
    shared: Shared | None


def _asked(
    lines: tuple[tuple[str, str], ...], spans: tuple[tuple[Span, ...], ...], years: int
) -> list[_Change | None]:
    """The changes of every span and line, one after the other; None where a line has none."""
    found: list[_Change | None] = []
    for row in spans:
        for line, ends in zip(lines, row, strict=True):
            if ends is None:
                found.append(None)
                continue
            first, last = (PopulationYear(*line, period) for period in ends)
            found.append(_Change(last, first, overlap(last, first, (), years)))
    return found


def _changes(
    collection: str,
    asked: list[_Change | None],
    loaded: Found,
    indicator: Indicator,
    settings: Settings,
) -> Estimate:
    """The last year of each less the first, [asked], each pair on the grid it shares."""

    def read(grid: AgeGrid, places: list[int]) -> Estimate:
        chosen = [one for at in places if (one := asked[at])]
        last, first = ([getattr(one, end) for one in chosen] for end in ("last", "first"))
        this, that = (_stacked(side, loaded, grid) for side in (last, first))
        return indicators.difference(
            indicator,
            this,
            that,
            settings,
            shared=_counted_in_both(chosen, loaded, this, that),
            streams=(_codes(collection, last), _codes(collection, first)),
        )

    def shared_grid(one: _Change | None) -> AgeGrid | None:
        if one is None:
            return None
        return loaded[one.last].panel.grid.common(loaded[one.first].panel.grid)

    return _scattered([shared_grid(one) for one in asked], read)


def _counted_in_both(
    chosen: Sequence[_Change], loaded: Found, this: Panel, that: Panel
) -> Panel | None:
    """What pooled years share; nothing where no two of them do."""
    if not any(one.shared for one in chosen):
        return None
    parts = [
        this[at].over(np.zeros_like)
        if one.shared is None
        else shared_part(loaded[one.shared].panel, this[at], that[at])
        for at, one in enumerate(chosen)
    ]
    return Panel.stack([replace(part, whole=None, standard=None) for part in parts])


def _rows(flat: list[T], width: int) -> tuple[tuple[T, ...], ...]:
    return tuple(tuple(flat[at : at + width]) for at in range(0, len(flat), width))
