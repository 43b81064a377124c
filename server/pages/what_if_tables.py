"""The tables of a what-if page, from which its pictures and twins are made too."""

from collections.abc import Sequence

import numpy as np

from engine.ages import Array
from engine.estimates import Reason
from engine.indicators import GROUPS, find
from server.exports.table import Cell, Column, Row, Table
from server.pages import cause_choices
from server.pages.cells import columns, count, gap, number, triple, withheld
from server.pages.population_year_tables import about, called, dated, what_it_counts, why_missing
from server.results.estimating import USUAL
from server.results.what_if import Findings
from server.results.what_if_question import Where
from server.sentences import death_rates as of_rates
from server.sentences import names
from server.sentences.text import _


def changes(found: Findings) -> tuple[of_rates.Changed, ...]:
    """The changes of the address, in words."""
    return tuple(
        _worded(found, row.where, row.percent or 0.0, row.sex) for row in found.question.changes
    )


def chosen(found: Findings) -> tuple[of_rates.Changed, ...]:
    """All that the address names, whether it changes or only seeks a target."""
    question = found.question
    named = [_worded(found, row.where, 0.0, row.sex) for row in question.rows]
    if question.toward:
        named.append(_worded(found, question.toward_where, 0.0, "p"))
    return tuple(named)


def _worded(found: Findings, where: Where, percent: float, sex: str) -> of_rates.Changed:
    last = int(where.last) if where.last else None
    return of_rates.Changed(percent, int(where.first), last, label_of(found, where.cause), sex)


def label_of(found: Findings, code: str) -> str:
    """The name of a cause; empty for all causes."""
    causes = found.changed.own.causes
    return next((cause_choices.name(one) for one in causes if one.code == code), "")


def benchmark_name(found: Findings) -> str:
    """The population whose rates stand in, with its year; empty where none does."""
    of = found.question.toward
    if of is None:
        return ""
    who = names.population(of.sex, found.holdings.name(of.area))
    return _("{who} in {year}", who=who, year=found.years_of(of))


def said(found: Findings) -> tuple[str, ...]:
    """Each change inside a sentence."""
    made = [of_rates.change(one) for one in changes(found)]
    if found.question.toward:
        where = _worded(found, found.question.toward_where, 0.0, "p")
        made.insert(0, of_rates.lent(benchmark_name(found), where))
    return tuple(made)


def figures(found: Findings) -> Table:
    """The few main figures, and the one asked for: now, at the changed rates, and the change."""
    keys = tuple(dict.fromkeys((found.question.of, *USUAL)))
    title = _("The figures at other death rates, {who}", who=_who(found))
    return _figures(found, "figures", title, keys)


def further(found: Findings) -> tuple[Table, ...]:
    """All other figures, a table for each group of the registry."""
    shown = {found.question.of, *USUAL}
    return tuple(
        _figures(found, f"figures-{group.key}", about(group), keys, told=())
        for group in GROUPS
        if (keys := [one.key for one in group.indicators if one.key not in shown])
    )


def _who(found: Findings) -> str:
    return names.sex_and_year(found.at.sex, found.period)


def _figures(
    found: Findings,
    name: str,
    title: str,
    keys: Sequence[str],
    *,
    told: Sequence[Reason] = (Reason.OPEN_GROUP_TOO_LARGE,),
) -> Table:
    numbers = found.changed.numbers
    heads = (
        Column("indicator", _("Indicator")),
        *columns("now", dated(found.period, found.loaded.status), 1),
        Column("then", _("would be"), decimals=1),
        *columns("change", _("change"), 1, signed=True),
        Column("first_order", _("first order"), decimals=1, signed=True),
    )
    note = _(
        "Under a figure its {level} % interval, which covers chance in deaths only. Change: would"
        " be less is, taken before rounding. First order: what the derivatives alone make of it.",
        level=round(100 * found.settings.level),
    )
    shown = {key: [numbers.now[key], numbers.change[key]] for key in keys}
    note = " ".join([note, *why_missing(shown, found.settings, told)])
    return Table(name, title, heads, tuple(_figure_row(found, key) for key in keys), note)


def _figure_row(found: Findings, key: str) -> Row:
    one, numbers = find(key), found.changed.numbers
    then, first = numbers.then[key], float(numbers.first_order[key])
    would = float(then.value)
    cells: list[Cell] = [key, *triple(numbers.now[key], one.unit, found.settings)]
    missing = gap(int(then.reason), found.settings)
    cells.append(one.unit.scale * would if np.isfinite(would) else missing)
    cells += triple(numbers.change[key], one.unit, found.settings)
    known = np.isfinite(first) and np.isfinite(float(numbers.change[key].value))
    cells.append(number(one.unit.scale * first if known else np.nan, _no_first_order()))
    return Row(
        tuple(cells),
        second=what_it_counts(key, found.settings, found.grid, whole_of(found)),
        shown=called(key, found.grid),
        decimals=one.unit.decimals,
    )


def _no_first_order() -> str:
    return _("It has no derivative by death rates.")


def whole_of(found: Findings) -> str:
    """Name of the area that this one is part of; empty where there is none."""
    held = found.holdings
    parent = next((one.parent for one in held.areas if one.code == found.at.area), "")
    return held.name(parent) if parent else ""


def by_group(found: Findings, cells: Array) -> Array:
    """[part, age] summed over parts and into the groups."""
    return found.grid.regroup(cells.sum(axis=-2), found.grid.fives)


def deaths(found: Findings) -> Table:
    """Deaths at each age as they were and as they would be, and the years of life behind them."""
    numbers, own = found.changed.numbers, found.changed.own
    fewer, left, there = (
        by_group(found, cells) for cells in (numbers.fewer, numbers.years, own.parts.deaths)
    )
    grid = found.grid.fives
    gone = found.withheld_on(grid)
    rows = tuple(
        Row((label, *([withheld()] * 4 if hidden else _counts(there[at], fewer[at], left[at]))))
        for at, (label, hidden) in enumerate(zip(grid.labels, gone, strict=True))
    )
    total = Row((_("all ages"), *_counts(there.sum(), fewer.sum(), left.sum())))
    title = _("Deaths by age at other death rates, {who}", who=_who(found))
    return Table("deaths", title, _heads("age", _("age")), rows, _note(), total=total)


def by_cause(found: Findings) -> Table | None:
    """The same by cause of death; None where there are none."""
    numbers, own = found.changed.numbers, found.changed.own
    if not own.causes:
        return None
    fewer, left, there = (
        _of_causes(found, cells) for cells in (numbers.fewer, numbers.years, own.parts.deaths)
    )
    rows = tuple(
        Row((one.code, *_counts(there[at], fewer[at], left[at])), shown=cause_choices.name(one))
        for at, one in enumerate(own.causes)
    )
    total = Row((_("all causes"), *_counts(there.sum(), fewer.sum(), left.sum())))
    title = _("Deaths by cause at other death rates, {who}", who=_who(found))
    return Table("causes", title, _heads("cause", _("cause")), rows, _note(), total=total)


def _of_causes(found: Findings, cells: Array) -> Array:
    """[part, age] summed over ages and sexes: [cause]."""
    causes = len(found.changed.own.causes)
    return np.asarray(cells.sum(axis=-1).reshape(-1, causes).sum(axis=0))


def _counts(there: float, fewer: float, left: float) -> tuple[Cell, ...]:
    return (
        count(float(there)),
        count(float(there - fewer)),
        count(-float(fewer)),
        count(-float(left)),
    )


def _heads(key: str, label: str) -> tuple[Column, ...]:
    return (
        Column(key, label),
        Column("there", _("deaths there were"), decimals=0, counted=True),
        Column("then", _("would be"), decimals=1),
        Column("change", _("change"), decimals=1, signed=True),
        Column("years", _("years of life"), _("lost or, below 0, not lost"), 0, signed=True),
    )


def _note() -> str:
    return _(
        "Among the people there were, at person-years as they are. Years of life are those left on"
        " average at the age of a death, at the death rates there were."
    )
