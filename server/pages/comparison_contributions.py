"""What each age adds to a difference, as tables: by groups with intervals, and age by age."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from engine.indicators import find
from server.exports.table import Cell, Column, Row, Table
from server.pages.cells import columns, gap, number, triple, withheld
from server.results.compared import Comparison
from server.results.explaining import DECOMPOSED, Contribution, decomposable
from server.results.parted import hidden_causes
from server.sentences import contributions as say
from server.sentences import kinds as kinds_say
from server.sentences import names
from server.sentences.numbers import number as number_text
from server.sentences.text import _
from server.store.records import Cause


@dataclass(frozen=True, slots=True)
class Printed:
    """How contributions to one indicator are printed."""

    key: str
    label: str
    unit: str
    scale: float  # contributions to H are printed in thousandths
    decimals: int


def printed(key: str) -> Printed:
    if key == "e0":
        return Printed(key, _("life expectancy"), _("years"), 1, 2)
    if key == "H":
        return Printed(key, _("unevenness"), _("thousandths of H"), 1_000, 1)
    one = find(key)
    label, unit = names.inside(_(names.brief(one.label))), one.unit
    words = "" if unit.label == "ratio" else _(unit.label)
    return Printed(key, label, words, unit.scale, unit.decimals + 1)


def shown(found: Comparison) -> tuple[Printed, ...]:
    """Life expectancy, unevenness, and what is asked for where ages have a part in it."""
    keys = dict.fromkeys((*DECOMPOSED, found.question.of))
    return tuple(printed(key) for key in keys if decomposable(find(key)))


def groups(found: Comparison) -> Table:
    """What each age group adds to the differences, with intervals and the sums."""
    heads = [Column("age", _("age"))]
    for one in shown(found):
        heads += columns(one.key, one.label, one.decimals, unit=one.unit, signed=True)
    rows = [
        Row((label, *(cell for one in shown(found) for cell in _triple(found, one, at))))
        for at, label in enumerate(found.groups.labels)
    ]
    rows += _remainders(found)
    return Table(
        "contributions",
        _("Contribution of each age to the differences"),
        tuple(heads),
        tuple(rows),
        total=Row(
            (_("sum: the difference"), *(c for one in shown(found) for c in _sum(found, one)))
        ),
    )


def whole_group_withheld(found: Comparison) -> NDArray[np.bool_]:
    """Groups of the picture in which every age of the grid is withheld on a side, [group]."""
    shown_ages = (~found.withheld).astype(float)
    return np.asarray(found.grid.regroup(shown_ages, found.groups) == 0)


def hidden_cells(found: Comparison, listed: Sequence[Cause]) -> NDArray[np.bool_]:
    """Cells all of whose deaths only stand in for withheld ones on a side, [cause, group]."""
    sides = (found.this.loaded, found.that.loaded)
    cells = np.logical_or.reduce([hidden_causes(one, found.grid, listed) for one in sides])
    return np.asarray(found.grid.regroup((~cells).astype(float), found.groups) == 0)


def _triple(found: Comparison, one: Printed, at: int) -> Iterable[Cell]:
    part = _part(found, one)
    if part is None:
        return [_missing(found, one)] * 3
    if whole_group_withheld(found)[at]:
        return [withheld()] * 3
    values = (float(column[at]) for column in (part.by_group, part.low, part.high))
    why = _("too few deaths, or lost in the simulation")
    return [number(one.scale * value, why) for value in values]


def _sum(found: Comparison, one: Printed) -> Iterable[Cell]:
    part, whole = _part(found, one), found.difference[one.key]
    if part is None:
        return [_missing(found, one)] * 3
    ends = (number(one.scale * float(end)) for end in (whole.low, whole.high))
    return [one.scale * part.difference, *ends]


def _part(found: Comparison, one: Printed) -> Contribution | None:
    return found.explained.contributions.get(one.key)


def _missing(found: Comparison, one: Printed) -> Cell:
    return gap(int(found.difference[one.key].reason), found.settings)


def _remainder_words(found: Comparison) -> str:
    """What the row of its own for what no age accounts for is called; empty where it is not owed:
    rounding is all there is."""
    parts = found.explained.contributions
    told = [
        say.remainder(find(key), part.remainder, part.difference)
        for key, part in reversed(parts.items())
    ]
    return next((words for words in told if words), "")


def _remainders(found: Comparison) -> Iterable[Row]:
    words, cells = _remainder_words(found), list[Cell]()
    none = number(np.nan, _("no age, hence no interval"))
    for one in shown(found):
        part = _part(found, one)
        gone = _missing(found, one)
        cells += [gone] * 3 if part is None else [one.scale * part.remainder, none, none]
    return [Row((words, *cells))] if words else []


def kinds(found: Comparison) -> Table:
    """The difference in life expectancy by kinds of change, from the laws fitted to both sides."""
    parts = found.explained.kinds
    unit = find("e0").unit
    rows = tuple(
        Row((key, *triple(one, unit, found.settings)), shown=words)
        for key, words, one in kinds_say.parts(parts)
    )
    total = Row((_("sum: the difference"), *triple(parts.difference, unit, found.settings)))
    misfits = (float(miss) for miss in parts.misfits)
    note = _(
        "A law of three terms (first year, all ages alike, old age) is fitted to the closed age"
        " groups of each side; its life expectancy is off by {this} and {that} years.",
        **{
            side: number_text(miss, 2, signed=True)
            for side, miss in zip(("this", "that"), misfits, strict=True)
        },
    )
    heads = (Column("kind", _("kind of change")), *columns("years", _("years"), 2, signed=True))
    return Table(
        "kinds", _("Kinds of change behind the difference"), heads, rows, note, total=total
    )


@dataclass(frozen=True, slots=True)
class _Ages:
    """One column of the table of single ages."""

    head: Column
    printed: Printed
    by_age: Array | None
    remainder: float


def ages(found: Comparison) -> Table:
    """Each age of the shared grid by itself; for e0 Arriaga's contributions stand beside, and where
    all years between are held, those along the path through them."""
    made = list(_columns(found))
    rows = [
        Row((label, *(withheld() if gone else _one(found, column, at) for column in made)))
        for at, (label, gone) in enumerate(zip(found.grid.labels, found.withheld, strict=True))
    ]
    words = _remainder_words(found)
    if words:
        rows.append(Row((words, *(_scaled(found, one, one.remainder) for one in made))))
    sums = (
        _scaled(found, one, np.nan if one.by_age is None else one.by_age.sum() + one.remainder)
        for one in made
    )
    return Table(
        "ages",
        _("Contribution of each single age group, by more than one method"),
        (Column("age", _("age")), *(one.head for one in made)),
        tuple(rows),
        _(
            "Columns for one figure add up to its difference; between ages they may part where many"
            " rates change at once, or where an age changed at other times than the rest."
        ),
        total=Row((_("sum"), *sums)),
    )


def _columns(found: Comparison) -> Iterable[_Ages]:
    for one in shown(found):
        part, decimals = _part(found, one), one.decimals + 1
        by_age, left = (None, 0.0) if part is None else (part.by_age, part.remainder)
        head = Column(one.key, one.label, one.unit, decimals, signed=True)
        yield _Ages(head, one, by_age, left)
        if one.key == "e0":
            for key, words, by_age in (
                ("e0_arriaga", _("by Arriaga’s formula"), found.arriaga),
                ("e0_pollard", _("by Pollard’s"), found.pollard),
            ):
                yield _Ages(Column(key, words, one.unit, decimals, signed=True), one, by_age, 0.0)
        if one.key == found.question.of and found.explained.path is not None and part is not None:
            words = _("{label}, through the years between", label=one.label)
            head = Column(f"{one.key}_path", words, one.unit, decimals, signed=True)
            along = found.explained.path
            yield _Ages(head, one, along, part.difference - float(along.sum()))


def _one(found: Comparison, column: _Ages, at: int) -> Cell:
    return _scaled(found, column, np.nan if column.by_age is None else float(column.by_age[at]))


def _scaled(found: Comparison, column: _Ages, value: float) -> Cell:
    if column.by_age is None:
        return _missing(found, column.printed)
    return number(column.printed.scale * float(value))
