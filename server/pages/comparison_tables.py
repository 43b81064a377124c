"""The tables of a comparison page, from which its pictures and twins are made too."""

from collections.abc import Iterable, Sequence

import numpy as np

from engine.ages import Array
from engine.indicators import GROUPS, find
from engine.settings import span
from server.exports.table import Cell, Column, Row, Table
from server.pages.cells import columns, gap, number, triple
from server.pages.population_year_tables import what_it_counts, why_missing
from server.results.comparison import DECOMPOSED, Comparison, Contribution, Side
from server.results.estimating import COMPARED, USUAL
from server.results.loading import Shared
from server.results.questions import PopulationYear
from server.sentences import comparison as say
from server.sentences import contributions as ages_say
from server.sentences import names
from server.sentences.text import _

RADIX = 100_000
THOUSAND = 1_000  # contributions to H are printed in thousandths
PRINTED = {"e0": 1, "H": THOUSAND}


def named(found: Comparison, of: PopulationYear | Shared) -> say.Named:
    periods = of.periods if isinstance(of, Shared) else span(of.period, found.settings.years)
    return say.Named(of.sex, found.holdings.name(of.area), names.years(periods))


def pair(found: Comparison) -> say.Pair:
    return say.Pair(named(found, found.this.of), named(found, found.that.of))


def figures(found: Comparison) -> Table:
    """The few main indicators, and the one asked for, on both sides, and the difference, each with
    its interval."""
    keys = tuple(dict.fromkeys((*USUAL, found.question.of)))
    return _figures(found, "figures", _("The figures of both sides"), keys)


def further(found: Comparison) -> tuple[Table, ...]:
    """All other indicators, a table for each group of the registry."""
    return tuple(
        _figures(found, f"figures-{group.key}", _(group.question), keys)
        for group in GROUPS
        if (
            keys := [
                one.key for one in group.indicators if one.key in COMPARED and one.key not in USUAL
            ]
        )
    )


def _figures(found: Comparison, name: str, title: str, keys: Sequence[str]) -> Table:
    both = pair(found)
    heads = (
        Column("indicator", _("Indicator")),
        *columns("this", _head(both.short(both.this), found.this), 1),
        *columns("that", _head(both.short(both.that), found.that), 1),
        *columns("difference", _("difference"), 1, signed=True),
    )
    note = _(
        "Under each figure its {level} % interval, which covers chance in deaths only."
        " Difference: {this} less {that}, taken before rounding.",
        level=round(100 * found.settings.level),
        this=both.this.whole,
        that=both.that.whole,
    )
    shown = {
        key: [found.this.estimates[key], found.that.estimates[key], found.difference[key]]
        for key in keys
    }
    note = " ".join([note, *why_missing(shown, found.settings)])
    return Table(name, title, heads, tuple(_figure_row(found, key) for key in keys), note)


def _head(label: str, side: Side) -> str:
    if side.loaded.status != "provisional":
        return label
    return _("{label}, provisional", label=label)


def _figure_row(found: Comparison, key: str) -> Row:
    indicator = find(key)
    cells: list[Cell] = [key]
    for side in (found.this.estimates[key], found.that.estimates[key], found.difference[key]):
        cells += triple(side, indicator.unit, found.settings)
    return Row(
        tuple(cells),
        second=what_it_counts(key, found.settings),
        shown=_(indicator.label),
        decimals=indicator.unit.decimals,
    )


def survivors(found: Comparison) -> Table:
    """Survivors of 100,000 born on both sides, at the starts of the groups."""
    both = pair(found)
    heads = (
        Column("age", _("age"), decimals=0),
        Column("this", both.short(both.this), decimals=0),
        Column("that", both.short(both.that), decimals=0),
        Column("difference", _("difference"), decimals=0, signed=True),
    )
    rows = []
    for age in found.groups.starts:
        at = found.this.table.grid.position(age)
        here, there = (RADIX * float(side.table.lx[at]) for side in (found.this, found.that))
        rows.append(Row((age, number(here), number(there), number(here - there))))
    return Table("survivors", _("Survivors to each age, of 100,000 born"), heads, tuple(rows))


def contributions(found: Comparison) -> Table:
    """What each age group adds to the differences in e0 and H, with the sums."""
    heads = (
        Column("age", _("age")),
        *columns("e0", _("life expectancy"), 2, unit=_("years"), signed=True),
        *columns("H", _("unevenness"), 1, unit=_("thousandths of H"), signed=True),
    )
    parts = [(found.contributions.get(key), PRINTED[key], key) for key in DECOMPOSED]
    rows = []
    for at, label in enumerate(found.groups.labels):
        cells: list[Cell] = [label]
        for part, scale, key in parts:
            cells += _cells(found, part, scale, key, at)
        rows.append(Row(tuple(cells)))
    rows += _remainder_row(found)
    total: list[Cell] = [_("sum: the difference")]
    for part, scale, key in parts:
        if part is None:
            total += [_missing(found, key)] * 3
            continue
        limits = (found.difference[key].low, found.difference[key].high)
        total += [scale * part.difference, *(number(scale * float(end)) for end in limits)]
    return Table(
        "contributions",
        _("Contribution of each age to the differences"),
        heads,
        tuple(rows),
        total=Row(tuple(total)),
    )


def _cells(
    found: Comparison, part: Contribution | None, scale: float, key: str, at: int
) -> Sequence[Cell]:
    if part is None:
        return [_missing(found, key)] * 3
    return [number(scale * float(column[at])) for column in (part.by_group, part.low, part.high)]


def _missing(found: Comparison, key: str) -> Cell:
    return gap(int(found.difference[key].reason), found.settings)


def _remainder_words(found: Comparison) -> str:
    """What the row of its own for what no age accounts for is called; empty where it is not owed:
    rounding is all there is."""
    parts = found.contributions.values()
    told = (ages_say.remainder(part.remainder, part.difference) for part in parts)
    return next((words for words in told if words), "")


def _remainder_row(found: Comparison) -> Iterable[Row]:
    words, cells = _remainder_words(found), list[Cell]()
    none = number(np.nan, _("no age, hence no interval"))
    for key in DECOMPOSED:
        part = found.contributions.get(key)
        gone = _missing(found, key)
        cells += [gone] * 3 if part is None else [PRINTED[key] * part.remainder, none, none]
    return [Row((words, *cells))] if words else []


def ages(found: Comparison) -> Table:
    """Each age of the shared grid by itself; for e0 Arriaga's contributions stand beside."""
    heads = (
        Column("age", _("age")),
        Column("e0", _("life expectancy"), _("years"), 3, signed=True),
        Column("e0_arriaga", _("by Arriaga’s formula"), _("years"), 3, signed=True),
        Column("H", _("unevenness"), _("thousandths of H"), 2, signed=True),
    )
    own = len(found.grid)
    beside = np.append(found.arriaga[: own - 1], found.arriaga[own - 1 :].sum())
    made: list[tuple[Array | None, float, str]] = [
        (_by_age(found, "e0"), 1, "e0"),
        (beside, 1, "e0"),
        (_by_age(found, "H"), THOUSAND, "H"),
    ]
    rows = tuple(
        Row((label, *(_one(found, column, scale, key, at) for column, scale, key in made)))
        for at, label in enumerate(found.grid.labels)
    )
    left = [_left(found, "e0"), 0.0, _left(found, "H")]
    sums = (
        _missing(found, key) if column is None else scale * (float(column.sum()) + rest)
        for (column, scale, key), rest in zip(made, left, strict=True)
    )
    words = _remainder_words(found)
    if words:
        rest = (
            _missing(found, key) if column is None else scale * part
            for (column, scale, key), part in zip(made, left, strict=True)
        )
        rows = (*rows, Row((words, *rest)))
    return Table(
        "ages",
        _("Contribution of each single age group, by two methods"),
        heads,
        rows,
        _(
            "Both columns for life expectancy add up to its difference; between ages they may part"
            " where many rates change at once."
        ),
        total=Row((_("sum"), *sums)),
    )


def _left(found: Comparison, key: str) -> float:
    part = found.contributions.get(key)
    return 0.0 if part is None else part.remainder


def _by_age(found: Comparison, key: str) -> Array | None:
    part = found.contributions.get(key)
    return None if part is None else part.by_age


def _one(found: Comparison, column: Array | None, scale: float, key: str, at: int) -> Cell:
    if column is None:
        return _missing(found, key)
    return number(scale * float(column[at]))
