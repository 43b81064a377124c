"""The picture of a trend: one line a series, bands for intervals."""

from typing import TypeVar

import numpy as np

from engine.ages import Array
from server.charts.chart import Chart, Sequence
from server.charts.chart import Series as Line
from server.charts.scales import ticks
from server.pages import breaks as of_breaks
from server.pages.drawing import values
from server.results.breaks import between, parting
from server.results.series import Series
from server.sentences import names
from server.sentences.numbers import number
from server.sentences.text import _

T = TypeVar("T")
COLOURS = 7
NAMED = 8  # so many lines are named at their ends


def draw(found: Series, finding: str, source: str) -> Chart | None:
    scaled = [
        found.indicator.unit.scale * np.asarray(part)
        for part in (found.estimate.value, found.estimate.low, found.estimate.high)
    ]
    if not np.isfinite(scaled[0]).any():
        return None
    low, high = (
        float(end(np.concatenate([part.ravel() for part in scaled])))
        for end in (np.nanmin, np.nanmax)
    )
    room = 0.06 * ((high - low) or abs(high) or 1.0)
    bottom, shown = _scale(low, high + room)
    decimals = found.indicator.unit.decimals
    unit = _measured(found)
    return Chart(
        key="trend-lines",
        finding=finding,
        unit=_unit(found),
        source=source,
        described=_(
            "Lines of {label} by year, {count} series; the numbers are in the table below.",
            label=names.inside(_(found.indicator.label)),
            count=len(found.lines),
        ),
        size="tall",
        x_kind="year",
        x_range=_span(found),
        y_title=unit
        if bottom == 0
        else _(
            "{unit} (scale begins at {start})",
            unit=unit,
            start=number(bottom, 0 if bottom == round(bottom) else decimals),
        ),
        y_range=(bottom, high + room),
        y_ticks=shown,
        hover=f"%{{customdata}}: %{{y:,.{decimals}f}}",
        table="years",
        breaks=of_breaks.rules(
            [one for one in found.broken if one.kind != "shock"],
            [area for area, _sex in found.lines],
            found.holdings.name,
        ),
        shocks=of_breaks.shocks([one.period for one in found.broken if one.kind == "shock"]),
        series=tuple(_line(found, line, *scaled) for line in range(len(found.lines))),
    )


def _scale(low: float, high: float) -> tuple[float, tuple[float, ...]]:
    """Where the scale begins, 0 where it is near, else a tick below all points; and its ticks."""
    if 0 <= low < 0.25 * high:
        return 0.0, ticks(0.0, high)
    step = float(np.diff(ticks(low, high))[0]) if len(ticks(low, high)) > 1 else high - low
    bottom = float(np.floor(low / step) * step)
    return bottom, ticks(bottom, high)


def _measured(found: Series) -> str:
    """What stands over the scale: the unit; of a ratio, which has none, what it is of."""
    one = found.indicator
    return _(names.brief(one.label)) if one.unit.label == "ratio" else _(one.unit.label)


def _unit(found: Series) -> str:
    label, unit = _(found.indicator.label), found.indicator.unit
    text = _(
        "{what}, {first} to {last}; bands are {level} % intervals",
        what=label
        if unit.label == "ratio"
        else _("{label}, {unit}", label=label, unit=_(unit.label)),
        first=found.periods[0],
        last=found.periods[-1],
        level=round(100 * found.settings.level),
    )
    if any("provisional" in status for status in found.status):
        text = _("{text}, hollow points are provisional", text=text)
    sexes = {sex for _area, sex in found.lines}
    if len(sexes) < 2:
        return text
    styles = {"f": _("women solid"), "m": _("men dashed"), "p": _("persons dotted")}
    told = ", ".join(styles[sex] for sex in ("f", "m", "p") if sex in sexes)
    return _("{text}; {styles}", text=text, styles=told)


def _span(found: Series) -> tuple[float, float]:
    first, last = float(found.periods[0]), float(found.periods[-1])
    return (first, last) if first < last else (first - 1, last + 1)


def _line(found: Series, line: int, value: Array, low: Array, high: Array) -> Line:
    area, sex = found.lines[line]
    labelled = len(found.lines) <= NAMED
    last = value[line][np.isfinite(value[line])]
    text = number(float(last[-1]), found.indicator.unit.decimals) if len(last) else ""
    name = found.holdings.name(area)
    several = len({one for one, _sex in found.lines}) > 1
    who = f"{name}, {names.sex(sex)}" if several else names.sex(sex)
    cut = _cuts(found, area)
    return Line(
        f"{who} {text}",
        _between_years(found.periods, cut),
        _cut(values(value[line]), cut, None),
        sex=sex,  # type: ignore[arg-type]
        role=_role(found, area),
        weight="one" if len(found.lines) <= 2 else "many",
        low=_cut(_limits(low[line]), cut, None),
        high=_cut(_limits(high[line]), cut, None),
        at="end" if labelled and len(last) else None,
        short=f"{name} {text}" if several else f"{names.sex(sex)} {text}",
        name=who,
        names=_cut(found.periods, cut, ""),
        provisional=_cut(tuple(one == "provisional" for one in found.status[line]), cut, False),
    )


def _cuts(found: Series, area: str) -> tuple[int, ...]:
    """Before which points the line of an area is broken."""
    breaks = parting(found.broken, area)
    return tuple(
        at
        for at in range(1, len(found.periods))
        if between(breaks, found.periods[at - 1], found.periods[at])
    )


def _between_years(periods: tuple[str, ...], cuts: tuple[int, ...]) -> tuple[float, ...]:
    """Where the points lie; a break half a year before the first year of the new kind."""
    years = [float(period) for period in periods]
    for at in reversed(cuts):
        years.insert(at, years[at] - 0.5)
    return tuple(years)


def _cut(column: tuple[T, ...], cuts: tuple[int, ...], gap: T) -> tuple[T, ...]:
    """A column with a gap at each break."""
    out = list(column)
    for at in reversed(cuts) if column else ():
        out.insert(at, gap)
    return tuple(out)


def _limits(column: Array) -> Sequence:
    return values(column) if np.isfinite(column).any() else ()


def _role(found: Series, area: str) -> str:
    """Colours in the palette's order of use, since its first ones lie farthest apart; beyond the
    last one a line is thin and named in the table only."""
    place = list(dict.fromkeys(one for one, _sex in found.lines)).index(area)
    return f"s{place + 1}" if place < COLOURS else "ink-2"
