"""One indicator through the years, for chosen areas and sexes: the trend's numbers."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from engine import indicators
from engine import settings as named
from engine.ages import AgeGrid
from engine.estimates import Estimate, Reason
from engine.indicators import Indicator
from engine.settings import Settings, span
from engine.standardisation import few_deaths
from server.results import courses
from server.results.breaks import between, crossed, parting, shocks
from server.results.courses import Course, newest, runs
from server.results.holdings import Holdings, NotInEdition, holdings
from server.results.loading import Beside, Found, Loaded, load
from server.results.protecting import protected_batch
from server.results.questions import PopulationYear, TrendQuestion
from server.results.revision import Moved, moved
from server.sentences.numbers import whole
from server.sentences.text import _
from server.store.breaks import in_order
from server.store.connect import Session
from server.store.heading import Heading
from server.store.records import Break

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
    estimated: tuple[bool, ...]  # [line]: some year's counts were shared out or worked out
    protected: tuple[tuple[bool, ...], ...]  # [line][period]: counts are withheld or rounded
    rounded: tuple[tuple[int, ...], ...]  # [line][period]: to which base; 0: not
    shared_out: tuple[tuple[bool, ...], ...]  # [line][period]: its counts are estimates
    status: tuple[tuple[str, ...], ...]  # [line][period]: final, provisional; "" where not held
    open_ages: tuple[tuple[int | None, ...], ...]  # [line][period]: where the table ends
    courses: tuple[Course, ...]  # [line]: of the newest years that no break parts
    before: tuple[Course, ...]  # those before breaks, of all lines, the oldest first
    fewest: float  # person-years of the smallest population drawn
    few_deaths: tuple[bool, ...]  # [line]: some year's standardised rate rests on few of them
    headline: PopulationYear  # the first line's newest figure, by which a newer edition is measured
    moved: Moved | None

    @property
    def broken(self) -> tuple[Break, ...]:
        """The breaks and years of shock of the areas drawn that lie among the years drawn."""
        areas = tuple(dict.fromkeys(area for area, _sex in self.lines))
        first, last = self.periods[0], self.periods[-1]
        return in_order(
            (
                *between(parting(self.holdings.breaks, *areas), first, last),
                *(
                    one
                    for one in shocks(self.holdings.breaks, *areas)
                    if first <= one.period <= last
                ),
            )
        )

    @property
    def ends(self) -> tuple[tuple[str, str] | None, ...]:
        """[line]: first and last year of its newest course."""
        return tuple(one.run.ends for one in self.courses)

    @property
    def middle(self) -> tuple[str, ...]:
        """[line]: the year in the middle of its newest course; "" where none."""
        return tuple(one.run.middle for one in self.courses)

    @property
    def earlier(self) -> Estimate:
        """[line]: the change up to the middle year."""
        return Estimate.stack([one.earlier for one in self.courses])

    @property
    def later(self) -> Estimate:
        """[line]: the change from it on."""
        return Estimate.stack([one.later for one in self.courses])

    @property
    def change(self) -> Estimate:
        """[line]: value at the last of `ends` less that at the first."""
        return Estimate.stack([one.change for one in self.courses])


def series(
    session: Session, heading: Heading, question: TrendQuestion, held: Holdings | None = None
) -> Series:
    """All lines and years of a completed question: four statements, one engine call a grid; two
    more statements where a newer edition stands.

    Raises: NotInEdition where nothing asked for is held; TooLarge.
    """
    held = held or holdings(session, heading.collection.code, heading.edition.number)
    settings, indicator = named.find(question.settings), indicators.find(question.of)
    lines, periods = _in_tree_order(held, question), _periods(held, question, settings.years)
    wanted = [PopulationYear(*line, period) for line in lines for period in periods]
    _require(held, question, wanted, indicator)
    collection, number = heading.collection.code, heading.edition.number
    beside = Beside.of(settings, held.areas, indicator)
    loaded = load(session, collection, number, wanted, beside, figures=question.figures)
    flat = protected_batch(
        _by_grid(collection, wanted, loaded, indicator, settings),
        indicator,
        [[loaded[one]] if one in loaded else [] for one in wanted],
    )
    estimate = _across_a_break(flat, wanted, held.breaks, settings.years)[
        np.arange(len(wanted)).reshape(len(lines), len(periods))
    ]
    of_lines = [
        runs(at, area, estimate.value[at], periods, held.breaks)
        for at, (area, _sex) in enumerate(lines)
    ]
    ordered = [newest(of_line) for of_line in of_lines]
    ordered += [
        run for at, of_line in enumerate(of_lines) for run in of_line if run is not ordered[at]
    ]
    asked = courses.asked(ordered, lines, settings.years)
    overlaps = {one.shared for one in asked if one and one.shared}
    if overlaps:
        loaded |= load(session, collection, number, overlaps, figures=question.figures)
    changes = protected_batch(
        courses.changes(collection, asked, loaded, indicator, settings),
        indicator,
        [[loaded[end] for end in (one.last, one.first)] if one else [] for one in asked],
    )[np.arange(len(asked)).reshape(3, len(ordered))]
    told = [
        Course(run, changes[0, at], changes[1, at], changes[2, at])
        for at, run in enumerate(ordered)
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
        estimated=tuple(
            any(one is not None and one.estimated for one in row)
            for row in _rows(found, len(periods))
        ),
        protected=_rows([one is not None and one.protected for one in found], len(periods)),
        rounded=_rows([one.rounded if one else 0 for one in found], len(periods)),
        shared_out=_rows([one is not None and one.estimated for one in found], len(periods)),
        status=_rows([one.status if one else "" for one in found], len(periods)),
        open_ages=_rows([one.panel.grid.open_age if one else None for one in found], len(periods)),
        courses=tuple(told[: len(lines)]),
        before=tuple(one for one in told[len(lines) :] if one.run.ends),
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
            figures=question.figures,
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
        panel, codes = courses.stacked(ones, loaded, grid), courses.codes(collection, ones)
        return indicators.estimate(indicator, panel, settings, streams=codes)

    grids = [loaded[one].panel.grid if one in loaded else None for one in wanted]
    return courses.scattered(grids, read)


def _newest(values: NDArray[np.float64], periods: tuple[str, ...]) -> str:
    """The last year with a value; the last year of all where none has one."""
    known = np.flatnonzero(np.isfinite(values))
    return periods[known[-1]] if len(known) else periods[-1]


def _figure(loaded: Loaded | None, indicator: Indicator, settings: Settings) -> float:
    if loaded is None:
        return np.nan
    return float(indicators.estimate(indicator, loaded.panel, settings).value)


def _across_a_break(
    estimate: Estimate, wanted: list[PopulationYear], breaks: Sequence[Break], years: int
) -> Estimate:
    """Without the figures of added years that lie on both sides of a break, [wanted]."""
    mixed = np.array(
        [crossed(parting(breaks, one.area), one.period, years) for one in wanted], bool
    )
    reason = np.where(mixed, np.uint8(Reason.ACROSS_A_BREAK), estimate.reason)
    value, low, high, se = (
        np.where(mixed, np.nan, part)
        for part in (estimate.value, estimate.low, estimate.high, estimate.se)
    )
    return Estimate(value, low, high, reason, se)


def _rows(flat: list[T], width: int) -> tuple[tuple[T, ...], ...]:
    return tuple(tuple(flat[at : at + width]) for at in range(0, len(flat), width))
