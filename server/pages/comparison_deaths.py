"""When people die on the two sides: ages at death, and the ratio of the rates."""

from collections.abc import Iterable

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from server.charts.chart import At, Chart, Mark, Series
from server.charts.scales import ratio_ticks, ticks
from server.exports.table import Column, Row, Table
from server.pages.cells import columns, number, withheld
from server.pages.comparison_charts import asked, axis
from server.pages.comparison_contributions import whole_group_withheld
from server.pages.comparison_tables import RADIX, pair
from server.pages.drawing import places, values
from server.results.compared import Comparison, Side
from server.sentences import ages_at_death as say
from server.sentences.numbers import number as text
from server.sentences.numbers import whole
from server.sentences.text import _

LONG = 16  # characters of a name that has no room beside the curve
WIDEST = 10.0  # the ratio scale ends where the rates of one side are so many times the other's
THIS, THAT = ("this", "s1"), ("that", "s2")


def ages_at_death(found: Comparison, source: str) -> Chart | None:
    """Of 100,000 born, with the mean, the median and the most common age of both."""
    if not _readable(found):
        return None
    density = [_density(found, side) for side in (found.this, found.that)]
    highest = max(float(np.nanmax(one)) for one in density)
    both = pair(found)
    return Chart(
        key="deaths",
        finding=say.spread(asked(found, "edagger"), both),
        unit=_(
            "Deaths per year of age in each age group, of 100,000 born; those at {age} and over are"
            " not drawn",
            age=found.groups.open_age,
        ),
        source=source,
        described=_(
            "Two curves of deaths by age, {this} and {that}, with the mean, the median and the most"
            " common age at death of both marked; the numbers are in the table below.",
            this=both.short(both.this),
            that=both.short(both.that),
        ),
        x_kind="age",
        x_range=axis(found),
        y_title=_("deaths"),
        y_range=(0, 1.75 * highest),
        y_ticks=ticks(0, highest),
        y_text=tuple(whole(at) for at in ticks(0, highest)),
        hover=_("age %{customdata}: %{y:,.0f} deaths"),
        table="deaths",
        series=(
            _line(found, found.this, density[0], *THIS),
            _line(found, found.that, density[1], *THAT),
        ),
        marks=tuple(_marks(found)),
        marks_top=1.08 * highest,
    )


def _readable(found: Comparison) -> bool:
    sides = (found.this, found.that)
    return all(np.isfinite(side.table.lx).all() for side in sides) and all(
        np.isfinite(_density(found, side)).any() for side in sides
    )


def _density(found: Comparison, side: Side) -> Array:
    """Deaths of 100,000 born per year of age, by closed group; nan where any is withheld."""
    starts = [side.table.grid.position(start) for start in found.groups.starts]
    dx = -RADIX * np.diff(side.table.lx[starts])
    gone = whole_group_withheld(found)[:-1]
    return np.asarray(np.where(gone, np.nan, dx / found.groups.widths[:-1]))


def _line(found: Comparison, side: Side, density: Array, weight: str, role: str) -> Series:
    label, groups = _called(found, side), found.groups
    return Series(
        label,
        places(groups.mids[:-1]),
        values(density),
        sex=side.sex,  # type: ignore[arg-type]
        role=role,
        weight=weight,  # type: ignore[arg-type]
        names=groups.labels[:-1],
        at=_label(found, side, density),
    )


def _called(found: Comparison, side: Side) -> str:
    both = pair(found)
    return both.short(both.this if side is found.this else both.that)


def _label(found: Comparison, side: Side, density: Array) -> At:
    """The later deaths are named to the right of where they fall, the earlier ones to the left of
    where they rise; on the phone the former at the upper left."""
    other = found.that if side is found.this else found.this
    ages, top = [side.table.ex[0], other.table.ex[0]], float(np.nanmax(density))
    mids, peak = found.groups.mids[:-1], int(np.nanargmax(density))
    half = np.nan_to_num(density) >= 0.5 * top
    if ages[0] > ages[1] or (ages[0] == ages[1] and side is found.this):
        last = int(np.flatnonzero(half)[-1])
        if len(_called(found, side)) > LONG:
            return At(2, 0.8 * top)
        return At(float(mids[last]), 0.55 * top, "left", 8, narrow_x=2, narrow_y=0.8 * top)
    first = int(np.flatnonzero(half[: peak + 1])[0])
    return At(float(mids[first]), 0.55 * top, "right", -8)


def _marks(found: Comparison) -> Iterable[Mark]:
    both = pair(found)
    words = {"e0": _("mean"), "median": _("median"), "mode": _("most common")}
    for key, word in words.items():
        for side, of in ((found.this, both.this), (found.that, both.that)):
            one = side.estimates[key]
            if np.isfinite(one.value):
                age = float(one.value)
                yield Mark(age, f"{word} {text(age, 1)}, {both.short(of)}")


def deaths_table(found: Comparison) -> Table:
    both = pair(found)
    heads = (
        Column("age", _("age")),
        Column("this", both.short(both.this), decimals=0),
        Column("that", both.short(both.that), decimals=0),
        Column("difference", _("difference"), decimals=0, signed=True),
    )
    starts = [found.this.table.grid.position(start) for start in found.groups.starts]
    dx = [
        RADIX * -np.diff(np.append(side.table.lx[starts], 0.0)) for side in (found.this, found.that)
    ]
    gone = whole_group_withheld(found)
    rows = tuple(
        Row(
            (
                label,
                *(
                    [withheld()] * 3
                    if gone[at]
                    else [number(float(one[at])) for one in (*dx, dx[0] - dx[1])]
                ),
            )
        )
        for at, label in enumerate(found.groups.labels)
    )
    return Table("deaths", _("Deaths by age, of 100,000 born"), heads, rows)


# ---- ratio of the rates


def ratios(found: Comparison, source: str) -> Chart | None:
    one, both = found.ratios, pair(found)
    shown = _sound(found)
    value, low, high = (np.where(shown, part, np.nan) for part in (one.value, one.low, one.high))
    value = np.where(value > 0, value, np.nan)
    if not np.isfinite(value).any():
        return None
    low = np.where(low > 0, low, np.nan)
    bottom, top = _reach(value, low, high)
    middles = np.append(found.groups.mids[:-1], found.groups.open_age + 3.0)
    inside = middles < axis(found)[1]
    on_scale = ratio_ticks(bottom, top)
    return Chart(
        key="ratios",
        finding=say.ratios(tellings(found), both),
        unit=_(
            "Death rate of {this} over that of {that}, by age group, with a {level} % band; at 1"
            " the two are equal",
            this=both.this.whole,
            that=both.that.whole,
            level=round(100 * found.settings.level),
        )
        if found.kind != "revision"
        else _(
            "Death rate of {this} over that of {that}, by age group; at 1 the two are equal",
            this=both.this.whole,
            that=both.that.whole,
        ),
        source=source,
        described=_(
            "Ratio of the death rates by age on a ratio scale, {this} over {that}; the numbers are"
            " in the table below.",
            this=both.short(both.this),
            that=both.short(both.that),
        ),
        x_kind="age",
        x_range=axis(found),
        y_title=_("times, ratio scale"),
        y_range=(bottom, top),
        y_ticks=on_scale,
        y_text=tuple(f"{at:g}" for at in on_scale),
        y_log=True,
        hover=_("age %{customdata}: %{y:.2f} times"),
        table="ratios",
        series=(
            Series("", axis(found), (1.0, 1.0), role="ink-2", weight="many", sex="f"),
            Series(
                both.short(both.this),
                places(middles[inside]),
                values(value[inside]),
                sex=found.this.sex,  # type: ignore[arg-type]
                low=values(low[inside]),
                high=values(high[inside]),
                names=tuple(
                    label for label, so in zip(found.groups.labels, inside, strict=True) if so
                ),
            ),
        ),
    )


def _reach(value: Array, low: Array, high: Array) -> tuple[float, float]:
    """Ends of the ratio scale, 1 inside: as far as the values go, and the band where it is narrow
    enough to be drawn whole."""
    known = value[np.isfinite(value)]
    ends = np.concatenate([known, *(part[np.isfinite(part)] for part in (low, high))])
    bottom = max(float(ends.min()), 1 / WIDEST)
    top = min(float(ends.max()), WIDEST)
    return min(bottom, float(known.min()), 0.9) / 1.05, max(top, float(known.max()), 1.1) * 1.05


def _sound(found: Comparison) -> NDArray[np.bool_]:
    """Groups whose ratio may be shown: of a printed table those whose rate its rounding leaves
    within a tenth; not those that are withheld."""
    return ~whole_group_withheld(found) & ~found.rounded


def tellings(found: Comparison) -> tuple[say.Telling, ...]:
    """Every group's ratio, in order, for the sentence."""
    one = found.ratios
    return tuple(
        say.Telling(label, float(value), float(low), float(high), exact=found.kind == "revision")
        for label, value, low, high, shown in zip(
            found.groups.labels, one.value, one.low, one.high, _sound(found), strict=True
        )
        if shown and np.isfinite(value)
    )


def ratio_table(found: Comparison) -> Table:
    both, groups = pair(found), found.groups
    heads = (
        Column("age", _("age")),
        Column("this", both.short(both.this), _("per 1,000"), 3),
        Column("that", both.short(both.that), _("per 1,000"), 3),
        *columns("ratio", _("times"), 2),
    )
    with np.errstate(all="ignore"):
        rates = [
            1000 * panel.deaths / panel.exposure
            for panel in (found.this.panel.regroup(groups), found.that.panel.regroup(groups))
        ]
    gone, rounded = whole_group_withheld(found), found.rounded
    coarse = _("the printed years are too rounded for a rate at this age")
    rows = []
    for at, label in enumerate(groups.labels):
        cells = [number(float(one[at])) for one in rates]
        of = (found.ratios.value, found.ratios.low, found.ratios.high)
        why = coarse if rounded[at] else _("nobody died on one side")
        cells += [number(np.nan if rounded[at] else float(part[at]), why) for part in of]
        rows.append(Row((label, *([withheld()] * 5 if gone[at] else cells))))
    note = _(
        "Rates as counted. The limits are exact for the deaths of each age group by itself: of many"
        " groups one in twenty lies outside its band by chance alone."
    )
    return Table("ratios", _("Death rates and their ratio, by age"), heads, tuple(rows), note)
