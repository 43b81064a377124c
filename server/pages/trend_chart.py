"""The picture of a trend: one line a series, bands for intervals."""

import numpy as np

from engine.ages import Array
from server.charts.chart import Chart, Sequence
from server.charts.chart import Series as Line
from server.charts.scales import ticks
from server.pages.drawing import values
from server.results.series import Series
from server.sentences import names
from server.sentences.numbers import number
from server.sentences.text import _

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
    return Line(
        f"{who} {text}",
        tuple(float(period) for period in found.periods),
        values(value[line]),
        sex=sex,  # type: ignore[arg-type]
        role=_role(found, area),
        weight="one" if len(found.lines) <= 2 else "many",
        low=_limits(low[line]),
        high=_limits(high[line]),
        at="end" if labelled and len(last) else None,
        short=f"{name} {text}" if several else f"{names.sex(sex)} {text}",
        name=who,
        names=found.periods,
        provisional=tuple(status == "provisional" for status in found.status[line]),
    )


def _limits(column: Array) -> Sequence:
    return values(column) if np.isfinite(column).any() else ()


def _role(found: Series, area: str) -> str:
    """Colours in the palette's order of use, since its first ones lie farthest apart; beyond the
    last one a line is thin and named in the table only."""
    place = list(dict.fromkeys(one for one, _sex in found.lines)).index(area)
    return f"s{place + 1}" if place < COLOURS else "ink-2"
