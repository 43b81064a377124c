"""The pictures of a comparison: two survival curves, and what each age adds."""

from typing import Literal

import numpy as np

from engine.ages import AgeGrid, Array
from engine.indicators import find
from server.charts.chart import At, Chart, Series
from server.charts.scales import decimals as decimals_of
from server.charts.scales import ticks
from server.pages.comparison_contributions import Printed, printed, whole_group_withheld
from server.pages.comparison_tables import RADIX, gone, pair
from server.pages.drawing import LONGER_LIFE, WHOLE_LIFE, at_age, places, values
from server.results.compared import Comparison, Side
from server.results.explaining import DECOMPOSED, Contribution
from server.sentences import comparison as say
from server.sentences import contributions as ages_say
from server.sentences import names
from server.sentences.numbers import number
from server.sentences.text import _

LONG = 24  # characters of a name that has no room to the right of its curve
LATE = 60  # the age past which a share of the difference is told
ROLES = ("s1", "s2")


def axis(found: Comparison) -> tuple[float, float]:
    """One age axis for all pictures of the page, with room for the open group."""
    return WHOLE_LIFE if found.groups.open_age < WHOLE_LIFE[1] else LONGER_LIFE


def asked(found: Comparison, key: str) -> say.Answer:
    return say.Answer(
        find(key),
        found.this.estimates[key],
        found.that.estimates[key],
        found.difference[key],
        exact=found.kind == "revision",
    )


def survivors(found: Comparison, source: str) -> Chart | None:
    tables = (found.this.table, found.that.table)
    if not all(np.isfinite(table.lx).all() and np.isfinite(table.ex[0]) for table in tables):
        return None
    late = tables[0].grid.position(LATE) if tables[0].grid.has(LATE) else None
    lived = tables[0].Lx - tables[1].Lx
    share = float(lived[late:].sum() / lived.sum()) if late and lived.sum() else 0.0
    both, (_low, top) = pair(found), axis(found)
    return Chart(
        key="survivors",
        finding=ages_say.survivors(asked(found, "e0"), share, LATE),
        unit=_(
            "Survivors to each age, of 100,000 born; the space between the curves is the difference"
            " in life expectancy"
        ),
        source=source,
        described=_(
            "Two curves of survivors by age, {this} and {that}, the space between them hatched; the"
            " numbers are in the table below it.",
            this=both.short(both.this),
            that=both.short(both.that),
        ),
        x_kind="age",
        x_range=axis(found),
        y_title=_("survivors, thousands"),
        y_range=(0, 1.03 * RADIX),
        y_ticks=tuple(RADIX * at / 4 for at in range(5)),
        y_text=tuple(f"{at}" for at in (0, 25, 50, 75, 100)),
        hover=_("age %{x}: %{y:,.0f} survivors"),
        table="survivors",
        size="tall",
        series=(
            _curve(found, found.this, both.short(both.this), "s1", "this", top),
            _curve(found, found.that, both.short(both.that), "s2", "that", top),
        ),
        between=(0, 1),
    )


def _curve(
    found: Comparison,
    side: Side,
    label: str,
    role: str,
    weight: Literal["this", "that"],
    top: float,
) -> Series:
    """The higher curve is named to its right, the lower one to its left."""
    table, other = side.table, (found.that if side is found.this else found.this).table
    starts = np.array(table.grid.starts, float)
    own = [found.grid.has(int(start)) and gone(found, side, int(start)) for start in starts]
    inside = (starts <= top) & ~np.array(own, np.bool_)
    upper = table.ex[0] > other.ex[0] or (table.ex[0] == other.ex[0] and side is found.this)
    age = 82.0 if upper else 62.0
    height = RADIX * at_age(table.grid, table.lx, age)
    at = (
        At(age + 2, height, "left", 4, narrow_x=68, narrow_y=1.0 * RADIX)
        if upper and len(label) <= LONG
        else At(top, 0.93 * RADIX, "right")
        if upper
        else At(age, height - 0.09 * RADIX, "right", -4)
    )
    return Series(
        label,
        places(starts[inside]),
        values(RADIX * table.lx[inside]),
        sex=side.sex,  # type: ignore[arg-type]
        role=role,
        weight=weight,
        at=at,
    )


def life_expectancy(found: Comparison, source: str) -> Chart | None:
    part = found.explained.contributions.get("e0")
    if part is None or found.same:
        return None
    span, carried = most(found, part)
    both = pair(found)
    return _bars(
        found,
        part,
        key="by-age",
        of=printed("e0"),
        finding=ages_say.by_age(asked(found, "e0"), span, carried),
        unit=_(
            "Years that each age group adds, {this} against {that}{intervals}; hatched: against the"
            " sum",
            this=both.this.whole,
            that=both.that.whole,
            intervals=_with_intervals(found),
        ),
        source=source,
    )


def unevenness(found: Comparison, source: str) -> Chart | None:
    part = found.explained.contributions.get("H")
    if part is None or found.same:
        return None
    age = turning(found, part)
    starts = np.array(found.groups.starts)
    scaled = printed("H").scale * part.by_group
    return _bars(
        found,
        part,
        key="unevenness",
        of=printed("H"),
        finding=ages_say.unevenness(
            asked(found, "H"),
            float(scaled[starts < age].sum()),
            float(scaled[starts >= age].sum()),
            age,
        ),
        unit=_(
            "Thousandths that each age group adds to relative unevenness (H){intervals}; hatched:"
            " against the sum",
            intervals=_with_intervals(found),
        ),
        source=source,
    )


def asked_for(found: Comparison, source: str) -> Chart | None:
    """The indicator asked for, where it is neither of the two that always stand there."""
    key = found.question.of
    part = found.explained.contributions.get(key)
    if key in DECOMPOSED or part is None or found.same:
        return None
    of, both = printed(key), pair(found)
    label = names.inside(_(find(key).label))
    span, carried = most(found, part)
    return _bars(
        found,
        part,
        key="asked",
        of=of,
        finding=ages_say.of_asked(asked(found, key), span, carried),
        unit=_(
            "What each age group adds to {what}, {this} against {that}{intervals}; hatched: against"
            " the sum",
            what=_("{label}, {unit}", label=label, unit=of.unit) if of.unit else label,
            this=both.this.whole,
            that=both.that.whole,
            intervals=_with_intervals(found),
        ),
        source=source,
    )


def _with_intervals(found: Comparison) -> str:
    """What a unit line says of intervals; nothing of a revision, which has none."""
    if found.kind == "revision":
        return ""
    return _(", with {level} % intervals", level=round(100 * found.settings.level))


def turning(found: Comparison, part: Contribution) -> int:
    """The start of a group that best parts the ages into two of unlike sign."""
    running = np.cumsum(part.by_group)[:-1]
    return found.groups.starts[int(np.argmax(np.abs(2 * running - part.by_group.sum()))) + 1]


def most(found: Comparison, part: Contribution) -> tuple[str, float]:
    """The shortest run of groups that holds at least half of the difference, and what it holds."""
    return shortest_run(found.groups, part.by_group)


def shortest_run(groups: AgeGrid, by_group: Array) -> tuple[str, float]:
    """The shortest run of groups that holds at least half of the sum, the one with most where
    several are as short; and what it holds."""
    starts, total = groups.starts, float(by_group.sum())
    ends = (*starts[1:], max(starts[-1] + 5, 105))
    sums = np.concatenate([[0.0], np.cumsum(by_group)])
    best = (float(ends[-1]), 0.0, 0, len(starts))
    for begin in range(len(starts)):
        for end in range(begin + 1, len(starts) + 1):
            held = (sums[end] - sums[begin]) / total if total else 0.0
            if held >= 0.5:
                best = min(best, (float(ends[end - 1] - starts[begin]), -held, begin, end))
                break
    _width, _held, begin, end = best
    carried = float(sums[end] - sums[begin])
    if end == len(starts):
        return _("{first} and over", first=starts[begin]), carried
    if end - begin == 1:
        return groups.labels[begin], carried
    return _("{first} to {last}", first=starts[begin], last=starts[end] - 1), carried


def _bars(
    found: Comparison,
    part: Contribution,
    *,
    key: str,
    of: Printed,
    finding: str,
    unit: str,
    source: str,
) -> Chart | None:
    """None where no age adds anything: nothing differs."""
    groups, (_first, top) = found.groups, axis(found)
    widths = np.append(groups.widths[:-1], min(10.0, top - groups.open_age))
    mids = np.array(groups.starts, float) + widths / 2
    missing = whole_group_withheld(found)
    y, low, high = (
        np.where(missing, np.nan, of.scale * column)
        for column in (part.by_group, part.low, part.high)
    )
    ends = np.concatenate([[0.0], y, low, high])
    bottom, ceiling = float(np.nanmin(ends)), float(np.nanmax(ends))
    if not ceiling > bottom:
        return None
    room = 0.06 * (ceiling - bottom)
    shown = ticks(bottom, ceiling)
    return Chart(
        key=key,
        finding=finding,
        unit=unit,
        source=source,
        described=_(
            "{unit}; the numbers are in the table of contributions.",
            unit=unit,
        ),
        x_kind="age",
        x_range=axis(found),
        y_title=of.unit or of.label,
        y_range=(bottom - room if bottom < 0 else 0.0, ceiling + room),
        y_ticks=shown,
        y_text=tuple(
            number(at, decimals_of(shown), signed=bottom < 0) if at else "0" for at in shown
        ),
        hover=f"%{{customdata}}: %{{y:.{of.decimals}f}}",
        table="contributions",
        series=(
            Series(
                unit,
                places(mids),
                values(y),
                draw="bars",
                low=values(low),
                high=values(high),
                widths=places(widths),
                names=groups.labels,
            ),
        ),
        foot_row=tuple(
            (float(mid), number(float(value), of.decimals, signed=True))
            for mid, value in zip(mids, y, strict=True)
            if np.isfinite(value)
        ),
        foot_sum=number(of.scale * float(part.by_group.sum()), of.decimals, signed=True),
    )
