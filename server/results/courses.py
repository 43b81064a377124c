"""How a line ran between two breaks: its first and last year, and the change from one to the other.

No change is ever taken across a break; a year of shock is neither the first, the last nor the
middle of a course.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from engine import indicators
from engine.ages import AgeGrid
from engine.estimates import Estimate, Reason
from engine.indicators import Indicator
from engine.panel import Panel
from engine.settings import Settings
from server.results.breaks import parting, pieces, shocks
from server.results.estimating import stream
from server.results.loading import Found, Shared, overlap, shared_part
from server.results.questions import PopulationYear
from server.store.records import Break

Line = tuple[str, str]  # area and sex
Ends = tuple[str, str]  # first and last year with a value
HALVED = 5  # fewer years have no halves worth telling apart


@dataclass(frozen=True, slots=True)
class Run:
    """The years of one line between two breaks."""

    line: int
    ends: Ends | None  # None: fewer than two values
    middle: str  # the year with a value in the middle of them; "" where none
    after: tuple[Break, ...]  # what parts it from the run before; empty for the first
    left_out: tuple[str, ...]  # years of shock within it


@dataclass(frozen=True, slots=True)
class Course:
    """A run, and what changed in it."""

    run: Run
    change: Estimate  # value at the last of its ends less that at the first
    earlier: Estimate  # the change up to the middle year
    later: Estimate  # the change from it on


def runs(
    line: int,
    area: str,
    values: NDArray[np.float64],
    periods: tuple[str, ...],
    breaks: Sequence[Break],
) -> tuple[Run, ...]:
    """The runs of a line, the oldest first."""
    own = parting(breaks, area)
    left = {one.period for one in shocks(breaks, area)}
    found = []
    for piece in pieces(periods, own):
        inside = np.array([period in piece and period not in left for period in periods])
        known = np.where(inside, values, np.nan)
        opening = max((one.period for one in own if one.period <= piece[0]), default="")
        follows = piece[0] != periods[0]
        found.append(
            Run(
                line,
                _ends(known, periods),
                _middle(known, periods),
                tuple(one for one in own if follows and one.period == opening),
                tuple(period for period in piece if period in left),
            )
        )
    return tuple(found)


def newest(of_line: Sequence[Run]) -> Run:
    """The last run that has a change; the last of all where none has."""
    return next((run for run in reversed(of_line) if run.ends), of_line[-1])


def _ends(values: NDArray[np.float64], periods: tuple[str, ...]) -> Ends | None:
    known = np.flatnonzero(np.isfinite(values))
    if len(known) < 2:
        return None
    return periods[known[0]], periods[known[-1]]


def _middle(values: NDArray[np.float64], periods: tuple[str, ...]) -> str:
    known = np.flatnonzero(np.isfinite(values))
    if len(known) < HALVED:
        return ""
    years = np.array([int(periods[at]) for at in known])
    return periods[int(known[np.argmin(np.abs(years - (years[0] + years[-1]) / 2))])]


@dataclass(frozen=True, slots=True)
class Change:
    """Two years of a line, and the years that both pool."""

    last: PopulationYear
    first: PopulationYear
    shared: Shared | None


def asked(all_: Sequence[Run], lines: Sequence[Line], years: int) -> list[Change | None]:
    """The changes of each run as a whole, of all their earlier and of all their later halves, one
    after the other; None where a run has none."""
    wholes = [run.ends for run in all_]
    earlier = [(run.ends[0], run.middle) if run.ends and run.middle else None for run in all_]
    later = [(run.middle, run.ends[1]) if run.ends and run.middle else None for run in all_]
    found: list[Change | None] = []
    for spans in (wholes, earlier, later):
        for run, ends in zip(all_, spans, strict=True):
            if ends is None:
                found.append(None)
                continue
            first, last = (PopulationYear(*lines[run.line], period) for period in ends)
            found.append(Change(last, first, overlap(last, first, (), years)))
    return found


def changes(
    collection: str,
    wanted: list[Change | None],
    loaded: Found,
    indicator: Indicator,
    settings: Settings,
) -> Estimate:
    """The last year of each less the first, [wanted], each pair on the grid it shares."""

    def read(grid: AgeGrid, places: list[int]) -> Estimate:
        chosen = [one for at in places if (one := wanted[at])]
        last, first = ([getattr(one, end) for one in chosen] for end in ("last", "first"))
        this, that = (stacked(side, loaded, grid) for side in (last, first))
        return indicators.difference(
            indicator,
            this,
            that,
            settings,
            shared=_counted_in_both(chosen, loaded, this, that),
            streams=(codes(collection, last), codes(collection, first)),
        )

    def shared_grid(one: Change | None) -> AgeGrid | None:
        if one is None:
            return None
        return loaded[one.last].panel.grid.common(loaded[one.first].panel.grid)

    return scattered([shared_grid(one) for one in wanted], read)


def _counted_in_both(
    chosen: Sequence[Change], loaded: Found, this: Panel, that: Panel
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


def stacked(ones: Sequence[PopulationYear], loaded: Found, grid: AgeGrid) -> Panel:
    return Panel.stack([loaded[one].panel.regroup(grid) for one in ones])


def codes(collection: str, ones: Sequence[PopulationYear]) -> NDArray[np.str_]:
    return np.stack([stream(collection, one) for one in ones])


def scattered(
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
