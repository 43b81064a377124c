"""Pictures of a page of causes: what each costs, at which ages, and one of them by year."""

from collections.abc import Sequence
from typing import Literal

import numpy as np

from engine.ages import AgeGrid, Array
from server.charts.chart import At, Chart, Series
from server.charts.scales import ticks
from server.pages import breaks as of_breaks
from server.pages import cause_choices
from server.pages.causes_tables import years
from server.pages.drawing import ages, places, values
from server.results.cause_course import OF, Course, newest
from server.results.cause_figures import CauseFigures
from server.sentences import causes as say
from server.sentences import names
from server.sentences.text import _

NAMED = 4  # causes drawn in colours of their own
SHOWN = 18  # rows at most
AHEAD = 15.0  # years of age that a name takes up
WIDE_YEARS, NARROW_YEARS = 0.85, 2.3  # years of age that a letter takes up, and on the phone
FARTHEST = 103.0  # age at which there is no more room for letters


def ranked(found: CauseFigures, source: str) -> Chart | None:
    """Years lost per death by cause, or, where they are not known, deaths; the most on top."""
    shown = found.order[:SHOWN]
    if not shown:
        return None
    lost = found.readable
    one = found.estimates["edagger"] if lost else found.deaths.share
    scale = 1.0 if lost else 100.0
    x, low, high = (scale * part[list(shown)] for part in (one.value, one.low, one.high))
    most = float(np.nanmax(np.where(np.isfinite(high), high, x))) * 1.05
    rows = tuple(float(len(shown) - at) for at in range(len(shown)))
    labels = tuple(cause_choices.name(found.causes[at]) for at in shown)
    first = (labels[0], one[shown[0]])
    unit = _("years lost per death") if lost else _("% of all deaths")
    return Chart(
        key="ranked",
        finding=say.ranked(found.all["edagger"], first if lost else None, years(found)),
        unit=_(
            "{unit} by cause, {who} in {year}; whiskers are {level} % intervals",
            unit=names.first_capital(unit),
            who=names.population(found.of.sex, found.name),
            year=found.period,
            level=round(100 * found.settings.level),
        ),
        source=source,
        described=_(
            "Rows of {count} causes with the {unit} that go with each; the numbers are in the table"
            " below.",
            count=len(shown),
            unit=unit,
        ),
        size=_size(len(shown)),
        x_kind="amount",
        x_range=(0.0, most),
        x_ticks=ticks(0.0, most),
        y_title=unit,
        y_range=(0.4, len(shown) + 0.6),
        y_ticks=rows,
        y_text=labels,
        hover="%{customdata}: %{x:,.2f}",
        table="causes",
        series=(
            Series(
                unit,
                places(x),
                rows,
                draw="reaches",
                low=values(low),
                high=values(high),
                name=unit,
                names=labels,
            ),
        ),
    )


def _size(rows: int) -> Literal["low", "std", "tall", "rows"]:
    """So high that the names of so many rows have room in print too."""
    return "low" if rows <= 5 else "std" if rows <= 7 else "tall" if rows <= 9 else "rows"


def by_age(found: CauseFigures, source: str) -> Chart | None:
    """At which ages: years lost per death for each year of age, the causes that cost most."""
    grid, shown = found.panel.grid, found.leading
    if not shown or not found.readable:
        return None
    # the first year, if it is a group, would dwarf all others: it stands in the table
    drawn = slice(1 if grid.starts[1] == 1 else 0, len(grid) - 1)
    density = found.lost[:, drawn] / grid.widths[drawn]
    most = 1.2 * float(np.nanmax(density[list(shown)]))
    named = _standing_out(density, shown, least=0.05 * most)
    others = [_line(found, density[at], at, drawn, None) for at in shown if at not in named]
    lengths = [len(cause_choices.name(found.causes[at])) for at in named]
    labels = _labels(grid.mids[drawn], density[named], 0.06 * most, lengths)
    lines = [
        _line(found, density[at], at, drawn, place, labels[place]) for place, at in enumerate(named)
    ]
    return Chart(
        key="by-age",
        finding=_most_of(found, shown[0]),
        unit=_(
            "Years lost per death for each year of age, by cause, {who} in {year}, without the"
            " first year of life; the thin lines are the other causes",
            who=names.population(found.of.sex, found.name),
            year=found.period,
        )
        if others
        else _(
            "Years lost per death for each year of age, by cause, {who} in {year}, without the"
            " first year of life",
            who=names.population(found.of.sex, found.name),
            year=found.period,
        ),
        source=source,
        described=_(
            "Lines by age of the years lost that go with each cause; the numbers are in the table"
            " below it."
        ),
        x_kind="age",
        x_range=ages(grid),
        y_title=_("years"),
        y_range=(0.0, most),
        y_ticks=ticks(0.0, most),
        hover=_("age %{customdata}: %{y:,.4f}"),
        table="ages",
        series=(*others, *lines),
    )


def _line(
    found: CauseFigures,
    density: Array,
    at: int,
    drawn: slice,
    place: int | None,
    label_at: At | None = None,
) -> Series:
    """One cause; those that cost most in a colour of their own, named where they stand out."""
    grid, label = found.panel.grid, cause_choices.name(found.causes[at])
    mids = grid.mids[drawn]
    return Series(
        label,
        places(mids),
        values(density),
        role="ink-2" if place is None else f"s{place + 1}",
        weight="many" if place is None else "this" if place == 0 else "one",
        at=label_at,
        name=label,
        names=grid.labels[drawn],
    )


def _standing_out(density: Array, shown: tuple[int, ...], *, least: float) -> list[int]:
    """Those that at some age lie above all others by so much, in the order of what they cost: their
    names find room there. Where none does, the one that costs most."""
    rows = density[list(shown)]
    lead = [float(_above(rows, place).max()) for place in range(len(shown))]
    first = sorted(range(len(shown)), key=lambda place: -lead[place])[:NAMED]
    return [shown[place] for place in sorted(first) if lead[place] >= least] or [shown[0]]


def _above(named: Array, place: int) -> Array:
    """How far one line lies above the highest of the others, by age."""
    others = np.delete(named, place, axis=0)
    return np.asarray(named[place] - (others.max(axis=0) if len(others) else 0.0))


def _apart(named: Array, place: int) -> int:
    """The age at which a line is named: its highest peak above the others that are named, or where
    it lies highest above them."""
    own, above = np.pad(named[place], 1), _above(named, place)
    peaks = (own[1:-1] > own[:-2]) & (own[1:-1] >= own[2:]) & (above > 0)
    return int(np.argmax(np.where(peaks, named[place], -1.0) if peaks.any() else above))


def _labels(mids: Array, named: Array, near: float, lengths: Sequence[int]) -> list[At]:
    """Where the names stand: over a peak, before a rise, behind a fall; one near another above it.
    A peak that others overtop soon after has its name before it, one that others overtopped shortly
    before behind it where there is room. On the phone a name stays on the
    picture."""
    found: list[At] = []
    for place, line in enumerate(named):
        half = NARROW_YEARS * lengths[place] / 2
        at = _apart(named, place)
        x, y = float(mids[at]), float(line[at])
        after = float(line[at + 1]) if at + 1 < len(line) else 0.0
        ahead = (mids > x) & (mids <= x + AHEAD)
        overtopped = bool((np.delete(named, place, axis=0)[:, ahead] > y).any())
        behind = (mids < x) & (mids >= x - AHEAD)
        crossed = bool((np.delete(named, place, axis=0)[:, behind] > y).any())
        over = 12 + 16 * sum(abs(one.x - x) < AHEAD + 10 and abs(one.y - y) < near for one in found)
        if overtopped or after > y:
            found.append(At(x, y, "right", dx=-8, dy=4))
        elif crossed and x + WIDE_YEARS * lengths[place] < FARTHEST:
            begin = max(0.0, min(x, FARTHEST - 2 * half))
            found.append(At(x, y, "left", dx=8, dy=8, narrow_x=begin, narrow_y=y + near))
        elif (float(line[at - 1]) if at else 0.0) < y:
            middle = max(half, min(x, FARTHEST - half))
            found.append(At(x, y, "center", dy=over, narrow_x=middle, narrow_y=y))
        else:
            found.append(At(x, y, "left", dx=8, dy=4))
    return found


def _most_of(found: CauseFigures, at: int) -> str:
    """The shortest run of groups that holds half of a cause's years."""
    lost, grid = found.lost[at], found.panel.grid
    first, last = half(lost)
    return say.ages(
        cause_choices.name(found.causes[at]),
        str(grid.starts[first]),
        _end(grid, last),
        float(lost[first : last + 1].sum() / lost.sum()),
    )


def half(lost: Array) -> tuple[int, int]:
    """The first and last place of the shortest run that holds at least half.

    >>> half(np.array([1.0, 5.0, 6.0, 2.0]))
    (1, 2)
    """
    reach = np.concatenate([[0.0], np.cumsum(lost)])
    runs = [
        (end - first, first, end - 1)
        for first in range(len(lost))
        for end in range(first + 1, len(lost) + 1)
        if reach[end] - reach[first] >= reach[-1] / 2
    ]
    _length, first, last = min(runs)
    return first, last


def _end(grid: AgeGrid, at: int) -> str:
    """The last age in completed years of a group."""
    return _("and over") if at == len(grid) - 1 else str(grid.starts[at + 1] - 1)


def course(found: CauseFigures, source: str) -> Chart | None:
    """The standardised rate of one cause by year, cut where its coding changed."""
    of = found.course
    if of is None or newest(of.estimate) < 0:
        return None
    scale = OF.unit.scale
    value, low, high = (
        scale * np.asarray(part) for part in (of.estimate.value, of.estimate.low, of.estimate.high)
    )
    most = 1.08 * float(np.nanmax(high))
    return Chart(
        key="course",
        finding=_course_finding(of, value),
        unit=_(
            "{label}, {unit}, {who}; the band is a {level} % interval",
            label=_(names.brief(OF.label)),
            unit=_(OF.unit.label),
            who=names.population(found.of.sex, found.name),
            level=round(100 * found.settings.level),
        ),
        source=source,
        described=_(
            "A line by year of the standardised death rate of {cause}; the numbers are in the table"
            " below it.",
            cause=names.inside(cause_choices.name(of.cause)),
        ),
        x_kind="year",
        x_range=(float(of.periods[0]), float(of.periods[-1])),
        y_title=_(OF.unit.label),
        y_range=(0.0, most),
        y_ticks=ticks(0.0, most),
        hover="%{customdata}: %{y:,.1f}",
        table="course",
        breaks=of_breaks.rules([*of.breaks, *of.bridged], [found.of.area], found.holdings.name),
        shocks=of_breaks.shocks([one.period for one in of.shocks]),
        series=(_course_line(found, of, value, low, high),),
    )


def _course_line(found: CauseFigures, of: Course, value: Array, low: Array, high: Array) -> Series:
    years = [float(period) for period in of.periods]
    columns = [list(values(part)) for part in (value, low, high)]
    labels, provisional = list(of.periods), [one == "provisional" for one in of.status]
    for at in reversed(of.cuts):
        years.insert(at, years[at] - 0.5)
        labels.insert(at, "")
        provisional.insert(at, False)
        for column in columns:
            column.insert(at, None)
    name = cause_choices.name(of.cause)
    return Series(
        name,
        tuple(years),
        tuple(columns[0]),
        sex=found.of.sex,  # type: ignore[arg-type]
        low=tuple(columns[1]),
        high=tuple(columns[2]),
        name=name,
        names=tuple(labels),
        provisional=tuple(provisional),
    )


def _course_finding(of: Course, value: Array) -> str:
    known = np.flatnonzero(np.isfinite(value))
    first, last = int(known[0]), int(known[-1])
    return say.course(
        cause_choices.name(of.cause),
        of.periods[first],
        float(value[first]),
        of.periods[last],
        float(value[last]),
        parted=bool(of.cuts) or first == last,
    )
