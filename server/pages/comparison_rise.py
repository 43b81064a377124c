"""How fast death rates rise with age on the two sides."""

from collections.abc import Iterable

import numpy as np
from numpy.typing import NDArray

from server.charts.chart import At, Chart, Series
from server.charts.scales import ticks
from server.exports.table import Column, Row, Table
from server.pages.cells import columns, number
from server.pages.comparison_charts import asked, axis
from server.pages.comparison_tables import pair
from server.pages.drawing import places, values
from server.results.compared import Comparison, Side
from server.sentences import ages_at_death as say
from server.sentences.text import _

SOUND_FROM = 40  # from which a printed table's steps are drawn
APART = 0.9  # years by which two dots at one age stand apart


def rise(found: Comparison, source: str) -> Chart | None:
    sides = (found.this, found.that)
    if not all(_drawn(side).any() for side in sides):
        return None
    both, (first, last) = pair(found), found.settings.ageing_span
    drawn = [
        *_dots(found.this, both.short(both.this), -APART, "s1"),
        *_dots(found.that, both.short(both.that), APART, "s2"),
        *_slopes(found),
    ]
    ends = [
        100 * part[_drawn(side)] for side in sides for part in (side.rises.low, side.rises.high)
    ]
    lowest, highest = (float(f(np.concatenate(ends))) for f in (np.min, np.max))
    floor, ceiling = min(0.0, 1.05 * lowest), 1.08 * max(highest, 1.0)
    return Chart(
        key="rise",
        finding=say.rise(asked(found, "ageing_rate"), both, (first, last)),
        unit=_(
            "Rise of death rates from one five-year age group to the next, at the age that parts"
            " them (a hundred times the change of the logarithm), with {level} % intervals, drawn"
            " where both have 100 deaths; lines: the slope from {first} to {last}",
            level=round(100 * found.settings.level),
            first=first,
            last=last,
        ),
        source=source,
        described=_(
            "Rise of death rates with age, by age, with intervals, {this} and {that}; the numbers"
            " are in the table below.",
            this=both.short(both.this),
            that=both.short(both.that),
        ),
        size="low",
        x_kind="age",
        x_range=axis(found),
        y_title=_("% per year of age"),
        y_range=(floor, ceiling),
        y_ticks=ticks(floor, ceiling),
        hover=_("at age %{customdata}: %{y:.1f} %"),
        table="rise",
        series=tuple(drawn),
    )


def _drawn(side: Side) -> NDArray[np.bool_]:
    """The steps that are drawn; of a printed table those above the ages at which its rounding
    alone makes them jump."""
    known = np.isfinite(side.rises.value)
    return known & (side.rises.at >= SOUND_FROM) if side.place.standard else known


def _slopes(found: Comparison) -> Iterable[Series]:
    """Of both sides over the settings’ ages, the higher one named above its line."""
    both, (first, last) = pair(found), found.settings.ageing_span
    levels = [100 * float(side.estimates["ageing_rate"].value) for side in (found.this, found.that)]
    for at, (side, of) in enumerate(((found.this, both.this), (found.that, both.that))):
        if np.isfinite(levels[at]):
            above = levels[at] > levels[1 - at] or (at == 0 and levels[0] == levels[1])
            yield Series(
                both.short(of),
                (float(first), float(last)),
                (levels[at], levels[at]),
                sex=side.sex,  # type: ignore[arg-type]
                role=("s1", "s2")[at],
                weight=("this", "that")[at],
                at=At(
                    float(first) - 1,
                    levels[at],
                    "right",
                    dy=9 if above else -9,
                    narrow_x=float(first) + 12,
                ),
            )


def _dots(side: Side, label: str, aside: float, role: str) -> Iterable[Series]:
    k = side.rises
    known = _drawn(side)
    yield Series(
        label,
        places(k.at[known] + aside),
        values(100 * k.value[known]),
        draw="dots",
        role=role,
        sex=side.sex,  # type: ignore[arg-type]
        low=() if side.place.standard else values(100 * k.low[known]),
        high=() if side.place.standard else values(100 * k.high[known]),
        names=tuple(f"{at:.0f}" for at in k.at[known]),
    )


def rise_table(found: Comparison) -> Table:
    both, ours, theirs = pair(found), found.this.rises, found.that.rises
    heads = (
        Column("age", _("age"), decimals=0),
        *columns("this", both.short(both.this), 1),
        *columns("that", both.short(both.that), 1),
    )
    few = _("fewer than 100 deaths in a group")
    rows = tuple(
        Row(
            (
                int(age),
                *(
                    number(100 * float(part[at]), few)
                    for k in (ours, theirs)
                    for part in (k.value, k.low, k.high)
                ),
            )
        )
        for at, age in enumerate(ours.at)
        if np.isfinite(ours.value[at]) or np.isfinite(theirs.value[at])
    )
    title = _("Rise of death rates with age, % per year of age")
    return Table("rise", title, heads, rows)
