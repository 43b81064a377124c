"""Ages and causes of death that a difference is made of: cells, ranked causes, tables."""

from collections.abc import Iterable

import numpy as np

from server.charts.chart import At, Chart, Note, Series
from server.charts.scales import ticks
from server.exports.table import Cell, Column, Row, Table
from server.pages.cells import columns, number, withheld
from server.pages.comparison_charts import asked, axis, shortest_run
from server.pages.comparison_contributions import Printed, hidden_cells, printed
from server.pages.comparison_tables import pair
from server.pages.drawing import places, values
from server.results.cause_parts import CauseParts
from server.results.compared import Comparison
from server.sentences import cause_contributions as say
from server.sentences.numbers import number as text
from server.sentences.pieces import Sentence
from server.sentences.text import _

ROWS = 12  # causes drawn; smaller ones are one row together
SIDE = 20.0  # of the largest square, px
LEAST = 1.5  # of the smallest that is drawn


def parts(found: Comparison) -> CauseParts | None:
    return None if found.same else found.explained.causes


def _order(of: CauseParts) -> list[int]:
    """Causes by the size of what they add, the largest first."""
    return [int(at) for at in np.argsort(-np.abs(of.by_cause), kind="stable")]


def _clear(low: float, high: float, *, exact: bool) -> bool:
    return exact or low > 0 or high < 0


def carriers(found: Comparison, of: CauseParts) -> list[say.Carrier]:
    """The causes, the largest first, with the ages that hold most of each."""
    one, exact = printed(of.key), found.kind == "revision"
    return [
        say.Carrier(
            _(of.list[at].label or of.list[at].code),
            one.scale * float(of.by_cause[at]),
            _clear(float(of.cause_low[at]), float(of.cause_high[at]), exact=exact),
            ages,
            one.scale * held,
        )
        for at in _order(of)
        for ages, held in [_ages(found, of, at)]
    ]


def _ages(found: Comparison, of: CauseParts, at: int) -> tuple[str, float]:
    """The shortest run of ages with at least half of what a cause adds, and what it holds; empty
    where other ages work so much against it that the run holds more than all."""
    run, held = shortest_run(found.groups, of.by_group[at])
    told = abs(held) <= abs(float(of.by_cause[at])) * (1 + 1e-9)
    return (run, held) if told else ("", 0.0)


def named(found: Comparison) -> list[say.Carrier]:
    """The causes of a clear difference that are told, the largest first."""
    of = parts(found)
    if of is None or not asked(found, of.key).clear:
        return []
    one = printed(of.key)
    way = np.sign(of.difference)
    return [
        cause
        for cause in carriers(found, of)
        if cause.clear and np.sign(cause.value) == way and abs(cause.value) >= abs(_tenth(of, one))
    ][: say.MOST]


def sentence(found: Comparison) -> Sentence:
    of = parts(found)
    if of is None:
        return ()
    one, told = printed(of.key), named(found)
    rest = one.scale * of.difference - sum(cause.value for cause in told)
    return say.carried(asked(found, of.key), told, rest, one.decimals)


def _tenth(of: CauseParts, one: Printed) -> float:
    return 0.1 * one.scale * of.difference


def charts(found: Comparison, source: str) -> Iterable[Chart]:
    of = parts(found)
    if of is not None:
        yield _ranked(found, of, source)
        yield _cells(found, of, source)


def _ranked(found: Comparison, of: CauseParts, source: str) -> Chart:
    one, shown = printed(of.key), _order(of)[:ROWS]
    value, low, high = (
        one.scale * part[shown] for part in (of.by_cause, of.cause_low, of.cause_high)
    )
    ends = np.concatenate([[0.0], value, low[np.isfinite(low)], high[np.isfinite(high)]])
    room = 0.06 * (float(ends.max() - ends.min()) or 1.0)
    x_range = (float(ends.min()) - room, float(ends.max()) + room)
    rows = tuple(float(len(shown) - at) for at in range(len(shown)))
    labels = tuple(_(of.list[at].label or of.list[at].code) for at in shown)
    first = carriers(found, of)[0]
    way = np.sign(of.difference)
    largest = first if first.clear and np.sign(first.value) == way else None
    answer = asked(found, of.key)
    return Chart(
        key="causes",
        finding=say.ranked(answer, largest if answer.clear else None),
        unit=_unit(found, one, _("What each cause of death adds to {what}, all ages together")),
        source=source,
        described=_(
            "Rows of causes of death with what each adds; the numbers are in the table below."
        ),
        size="low" if len(shown) <= 7 else "std",
        x_kind="amount",
        x_range=x_range,
        x_ticks=ticks(*x_range),
        y_title=one.unit or one.label,
        y_range=(0.4, len(shown) + 0.6),
        y_ticks=rows,
        y_text=labels,
        hover=f"%{{customdata}}: %{{x:+,.{one.decimals}f}}",
        table="causes",
        series=(
            Series(
                "",
                places(value),
                rows,
                draw="reaches",
                low=values(low),
                high=values(high),
                name=one.label,
                names=labels,
            ),
        ),
    )


def _unit(found: Comparison, one: Printed, what: str) -> str:
    both = pair(found)
    told = what.format(
        what=_("{label}, {unit}", label=one.label, unit=one.unit) if one.unit else one.label
    )
    sides = _("{this} against {that}", this=both.this.whole, that=both.that.whole)
    if found.kind == "revision":
        return _("{what}, {sides}", what=told, sides=sides)
    return _(
        "{what}, {sides}, with {level} % intervals",
        what=told,
        sides=sides,
        level=round(100 * found.settings.level),
    )


def _cells(found: Comparison, of: CauseParts, source: str) -> Chart:
    """Each cell a square as large as what it adds; the smaller causes together in the last row."""
    one, order = printed(of.key), _order(of)
    shown = order if len(order) <= ROWS else order[: ROWS - 1]
    grids = [of.by_group[at] for at in shown]
    labels = [_(of.list[at].label or of.list[at].code) for at in shown]
    if len(order) > len(shown):
        grids.append(of.by_group[order[len(shown) :]].sum(axis=0))
        labels.append(_("all other causes"))
    table = one.scale * np.stack(grids)
    largest = float(np.abs(table).max()) or 1.0
    sides = SIDE * np.sqrt(np.abs(table) / largest)
    middles = np.append(found.groups.mids[:-1], found.groups.open_age + 3.0)
    drawn = [
        (float(middles[group]), float(len(labels) - row), row, group)
        for row in range(len(labels))
        for group in range(len(middles))
        if sides[row, group] >= LEAST and middles[group] < axis(found)[1]
    ]
    rows = tuple(float(len(labels) - row) for row in range(len(labels)))
    return Chart(
        key="cells",
        finding=_largest_cell(found, of, one),
        unit=_(
            "What each cause adds at each age to {what}: the larger the square, the more; filled"
            " above 0, open below it. The largest is {largest}",
            what=_("{label}, {unit}", label=one.label, unit=one.unit) if one.unit else one.label,
            largest=text(largest, one.decimals),
        ),
        source=source,
        described=_(
            "Squares by age and cause of death, as large as what each adds; the numbers are in the"
            " table below."
        ),
        size="rows" if len(labels) > 5 else "tall",
        x_kind="age",
        x_range=axis(found),
        y_title="",
        y_range=(0.35, len(labels) + 0.75),
        y_ticks=rows,
        y_text=("",) * len(rows),
        hover="%{customdata}",
        table="cells",
        series=(
            Series(
                "",
                tuple(x for x, _y, _row, _group in drawn),
                tuple(y for _x, y, _row, _group in drawn),
                draw="squares",
                widths=tuple(float(sides[row, group]) for _x, _y, row, group in drawn),
                provisional=tuple(bool(table[row, group] < 0) for _x, _y, row, group in drawn),
                name=one.label,
                names=tuple(
                    f"{labels[row]}, {found.groups.labels[group]}: "
                    f"{text(float(table[row, group]), one.decimals, signed=True)}"
                    for _x, _y, row, group in drawn
                ),
            ),
        ),
        notes=tuple(
            Note(label, At(axis(found)[0], row + 0.46))
            for label, row in zip(labels, rows, strict=True)
        ),
    )


def _largest_cell(found: Comparison, of: CauseParts, one: Printed) -> str:
    cause, group = np.unravel_index(int(np.argmax(np.abs(of.by_group))), of.by_group.shape)
    answer = asked(found, of.key)
    clear = _clear(
        float(of.low[cause, group]), float(of.high[cause, group]), exact=found.kind == "revision"
    )
    if not (answer.clear and clear):
        return say.cells(answer, "", "", "")
    value = text(one.scale * float(of.by_group[cause, group]), one.decimals, signed=True)
    told = f"{value}\N{NO-BREAK SPACE}{one.unit}" if one.unit else value
    cause_label = _(of.list[cause].label or of.list[cause].code)
    return say.cells(answer, cause_label, found.groups.labels[group], told)


def tables(found: Comparison) -> Iterable[Table]:
    of = parts(found)
    if of is not None:
        yield _by_cause(found, of)
        yield _by_cell(found, of)


def _by_cause(found: Comparison, of: CauseParts) -> Table:
    one, both = printed(of.key), pair(found)
    heads = [
        Column("cause", _("cause of death")),
        Column("this", both.short(both.this), _("deaths"), 0, counted=True),
        Column("that", both.short(both.that), _("deaths"), 0, counted=True),
        *columns("adds", one.label, one.decimals, unit=one.unit, signed=True),
    ]
    if of.path is not None:
        words = _("{label}, through the years between", label=one.label)
        heads.append(Column("path", words, one.unit, one.decimals, signed=True))
    rows = []
    for at in _order(of):
        cells: list[Cell] = [float(side[at]) for side in of.deaths]
        cells += [
            number(one.scale * float(part[at]))
            for part in (of.by_cause, of.cause_low, of.cause_high)
        ]
        cells += [] if of.path is None else [number(one.scale * float(of.path[at]))]
        cause = of.list[at]
        rows.append(
            Row(
                (cause.code, *cells),
                shown=_(cause.label or cause.code),
                second=", ".join(cause.ranges),
            )
        )
    rows += _remainder(of, one, len(heads) - 4)
    total: list[Cell] = [float(side.sum()) for side in of.deaths]
    total += [
        one.scale * of.difference,
        *(number(one.scale * float(end)) for end in _ends(found, of)),
    ]
    total += [] if of.path is None else [one.scale * of.difference]
    return Table(
        "causes",
        _("Contribution of each cause of death to the difference in {label}", label=one.label),
        tuple(heads),
        tuple(rows),
        total=Row((_("sum: the difference"), *total)),
    )


def _ends(found: Comparison, of: CauseParts) -> tuple[float, float]:
    whole = found.difference[of.key]
    return float(whole.low), float(whole.high)


def _remainder(of: CauseParts, one: Printed, columns: int) -> list[Row]:
    """What no age’s rate accounts for, where that is more than rounding."""
    if abs(of.remainder) <= 1e-9 * max(abs(of.difference), 1e-9):
        return []
    none = number(np.nan, _("no cause, hence no interval"))
    rest: list[Cell] = [none] * columns
    cells: list[Cell] = [none, none, one.scale * of.remainder, *rest]
    if of.path is not None:
        cells[-1] = one.scale * (of.difference - float(of.path.sum()))
    words = _("no cause: rule of the first year, older or younger people, or a law’s weights")
    return [Row(("remainder", *cells), shown=words)]


def _by_cell(found: Comparison, of: CauseParts) -> Table:
    """A row for every age group, a column with its limits for every cause; sums at both edges."""
    one = printed(of.key)
    heads = [Column("age", _("age"))]
    for cause in of.list:
        label = _(cause.label or cause.code)
        heads += columns(cause.code, label, one.decimals, unit=one.unit, signed=True)
    heads.append(Column("all", _("all causes"), one.unit, one.decimals, signed=True))
    rows, hidden = [], hidden_cells(found, of.list)
    for group, label in enumerate(found.groups.labels):
        cells: list[Cell] = [
            withheld() if hidden[cause, group] else number(one.scale * float(part[cause, group]))
            for cause in range(len(of.list))
            for part in (of.by_group, of.low, of.high)
        ]
        rows.append(Row((label, *cells, one.scale * float(of.by_group[:, group].sum()))))
    ends: list[Cell] = [
        number(one.scale * float(part[cause]))
        for cause in range(len(of.list))
        for part in (of.by_cause, of.cause_low, of.cause_high)
    ]
    note = _(
        "All cells{remainder} add up to the difference, {difference}.",
        remainder=_(
            " and {rest} that no age’s rate accounts for",
            rest=text(one.scale * of.remainder, one.decimals, signed=True),
        )
        if _remainder(of, one, 4)
        else "",
        difference=text(one.scale * of.difference, one.decimals, signed=True),
    )
    return Table(
        "cells",
        _("Contribution of each age and cause to the difference in {label}", label=one.label),
        tuple(heads),
        tuple(rows),
        note,
        total=Row((_("sum"), *ends, one.scale * float(of.by_group.sum()))),
    )
