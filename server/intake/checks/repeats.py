"""Checks for numbers that stand twice: a year repeated, rows copied from another area, sex or year.

Equal numbers prove little where they are small, or lie on a smooth line. How unlikely it is that a
count v is met again by chance is taken as at most that of a Poisson law at its middle, one over
sqrt(4 pi v); a repetition is told where its numbers together would come about once in 10,000
uploads of this size.
"""

from collections.abc import Iterator
from dataclasses import dataclass
from functools import reduce
from typing import TypeVar

import numpy as np

from engine.ages import Array
from server.intake.cells import YEARS, Ints
from server.intake.checks.check import Check, several
from server.intake.checks.series import years_worded
from server.intake.courses import courses
from server.intake.ledger import Ledger
from server.intake.problems import Fault, Value
from server.intake.rated import Rated, rated, unsummed
from server.intake.schedules import Block

AIM = np.log(1e4)
Counts = TypeVar("Counts", Array, Ints)
WINDOWS = (5, 10)  # age groups in a row that are looked for elsewhere
MEASURES = ("deaths", "person_years")


@dataclass(frozen=True, slots=True)
class Twice:
    """Lines with the same numbers."""

    line: Ints
    same: Ints  # the first line that has them


def _marks(values: Array, seed: int) -> Ints:
    """A number for each cell, such that sums of them are equal where the cells are, and by chance
    hardly ever: [line, age]."""
    weights = np.random.default_rng(seed).integers(1, 2**62, values.shape[-1]) * 2 + 1
    bits = np.ascontiguousarray(values).view(np.int64)
    return np.asarray((bits ^ (bits >> 31)) * weights)


def _proof(values: Array, unit: float) -> Array:
    """How unlikely it is that these counts are met again by chance, as a logarithm: [..., age] ->
    [...]. Populations run smoothly over ages, and smooth lines meet: so what counts is the level,
    the slope, and how far each count lies off the middle of its neighbours, none of them for more
    than a Poisson count would."""
    counts = values / unit
    chance = np.sqrt(4 * np.pi * np.maximum(counts, 1 / (4 * np.pi)))
    off = np.abs(counts[..., 1:-1] - (counts[..., :-2] + counts[..., 2:]) / 2)
    rough = np.log(np.minimum(1 + 2 * off, chance[..., 1:-1])).sum(axis=-1)
    slope = np.minimum(1 + np.abs(counts[..., -1] - counts[..., 0]), chance[..., -1])
    return np.asarray(rough + np.log(slope) + np.log(chance[..., 0]))


def _unit(values: Array) -> float:
    """The power of ten that all numbers are rounded to: 1000 where they are full thousands."""
    unit = 1.0
    for _ in range(4):
        ten = 10 * unit
        if not values.size or (values[0] % ten).any() or (values % ten).any():
            return unit
        unit = ten
    return unit


def _pairs(keys: Ints, order: Ints) -> Twice:
    """Neighbours in this order that have the same key; the first of a run is the one copied."""
    again = np.append(False, keys[order[1:]] == keys[order[:-1]])[: len(order)]
    first = np.maximum.accumulate(np.where(again, 0, np.arange(len(order))))
    return Twice(order[again], order[first[again]])


def _repeated_years(ledger: Ledger) -> Iterator[Fault]:
    """Years whose numbers are those of another year of the area and sex, at every age."""
    for measure in MEASURES:
        for block, place, ages, own in _lines(ledger, measure):
            marks = _marks(ages, 1).sum(axis=-1)
            if len(np.unique(marks)) == len(marks):
                continue
            series = place // YEARS
            twice = _pairs(marks * 1_000_003 + series, np.lexsort((place, marks, series)))
            least = AIM + np.log(max(len(marks), 2))
            unit = _unit(block.values)
            for line, same in _by_first(twice):
                here = own[np.append(line, same)]
                known = np.isfinite(ages[same]).all() and (here >= 0).any()
                if known and _proof(ages[same], unit) > least:
                    yield _repeated(ledger, block, here[here >= 0], place[line], place[same])


def _lines(ledger: Ledger, measure: str) -> Iterator[tuple[Block, Ints, Array, Ints]]:
    """Block, and among what stands: place, counts by age, and line of the block, -1 where it only
    stands."""
    if not ledger.past:
        for block in ledger.of(measure):
            yield block, block.place, block.values, np.arange(len(block.place))
        return
    for course in courses(ledger, measure):
        yield course.block, course.place, course.values[:, 1:], course.own


def _by_first(twice: Twice) -> Iterator[tuple[Ints, int]]:
    """All lines that have the numbers of one line, and that line."""
    order = np.argsort(twice.same, kind="stable")
    same, begins = np.unique(twice.same[order], return_index=True)
    for first, lines in zip(same.tolist(), np.split(twice.line[order], begins[1:]), strict=False):
        yield np.sort(lines), first


def _repeated(ledger: Ledger, block: Block, own: Ints, places: Ints, of: int) -> Fault:
    years = sorted((places % YEARS).tolist())
    values: dict[str, Value] = {"years": years_worded(years), "same": str(int(of) % YEARS)}
    return block.fault(block.row[own[0]], ledger.named(int(places[0])) | values)


def _repeated_rates(ledger: Ledger) -> Iterator[Fault]:
    """Years whose death rates are those of another year, though the counts differ."""
    for one in rated(ledger):
        with np.errstate(all="ignore"):
            whole = np.where(one.people > 0, one.rates, 0.0).sum(axis=-1)
        order = np.lexsort((whole, one.place // YEARS))
        near = (one.place[order[:-1]] // YEARS == one.place[order[1:]] // YEARS) & (
            np.abs(np.diff(whole[order])) <= 1e-8 * whole[order[1:]]
        )
        both = np.sort(np.stack([order[:-1][near], order[1:][near]]), axis=0)
        first, second = both[0], both[1]
        with np.errstate(invalid="ignore"):
            apart = np.abs(one.rates[first] - one.rates[second]) > 1e-7 * one.rates[first]
        alike = ~(apart & (one.deaths[first] > 0)).any(axis=-1)
        differ = (one.people[first] != one.people[second]).any(axis=-1)
        enough = _proof(one.deaths[first], 1.0) > AIM + np.log(max(len(whole), 2))

        def fault(at: int, one: Rated = one, first: Ints = first, second: Ints = second) -> Fault:
            values: dict[str, Value] = {"same": str(int(one.place[first[at]]) % YEARS)}
            return one.fault(ledger, int(second[at]), 0, values)

        yield from several(np.flatnonzero(alike & differ & enough), fault)


def _copied(ledger: Ledger) -> Iterator[Fault]:
    """Ages in a row whose numbers stand in another area, sex or year as well."""
    for measure in MEASURES:
        for block in ledger.of(measure):
            lines = np.flatnonzero(unsummed(ledger, block.place))
            if len(lines) > 1 and len(block.grid) >= WINDOWS[0]:
                yield from _copies(ledger, block, lines)


def _copies(ledger: Ledger, block: Block, lines: Ints) -> Iterator[Fault]:
    values = block.values if len(lines) == len(block.place) else block.values[lines]
    marks, unit = _marks(values, 2), _unit(values)
    pairs = [_met(values, marks, unit, width) for width in WINDOWS if width <= values.shape[-1]]
    line, same = np.unique(np.concatenate(pairs, axis=-1), axis=-1)
    series = block.place[lines] // YEARS
    repeated = (values[line] == values[same]).all(axis=-1) & (series[line] == series[same])

    def fault(at: int) -> Fault:
        equal = (values[line[at]] == values[same[at]]) & (values[line[at]] > 0)
        other = ledger.named(int(block.place[lines[same[at]]]))
        ages, row = np.flatnonzero(equal), int(lines[line[at]])
        found: dict[str, Value] = {
            "ages": len(ages),
            "first": block.grid.labels[int(ages[0])],
            "other_area": other["area"],
            "other_sex": other["sex"],
            "other_year": other["year"],
        }
        return block.fault(block.row[row, ages], ledger.named(int(block.place[row])) | found)

    yield from several(np.flatnonzero(~repeated), fault)


def _met(values: Array, marks: Ints, unit: float, width: int) -> Ints:
    """Lines, and the first ones with the same numbers in a window so wide, [two, pair]."""
    many = values.shape[-1] // width
    least = AIM + 2 * np.log(max(len(values) * many, 2)) - np.log(2)
    large = (
        width * unit * np.exp(2 * least / width) / (4 * np.pi)
    )  # smaller counts prove too little
    at = np.flatnonzero(_in_windows(values, width) > large)
    keys = _in_windows(marks, width)[at]
    ordered = np.sort(keys)
    again = np.isin(keys, ordered[1:][ordered[1:] == ordered[:-1]])
    at, keys = at[again], keys[again]
    sure = _proof(values[:, : many * width].reshape(-1, width)[at], unit) > least
    at, keys = at[sure], keys[sure]
    twice = _pairs(keys, np.lexsort((at, keys)))
    return np.stack([at[twice.line] // many, at[twice.same] // many])


def _in_windows(of: Counts, width: int) -> Counts:
    """Sums over so many ages in a row, one row of windows after the other: [window]."""
    end = of.shape[-1] // width * width
    parts = [of[:, start:end:width] for start in range(width)]
    return reduce(np.add, parts).ravel()


SOURCE = "Ebbline's own; how unlikely a repetition is by chance is a Poisson law's."
CHECKS: tuple[Check[Ledger], ...] = (
    Check(
        key="year_repeated",
        severity="warning",
        meaning="A year has, age by age, the same numbers as another year of the same area and "
        "sex.",
        why="A year copied in place of one that was not at hand looks like any other: its figures "
        "are plausible, only wrong.",
        found="the numbers of {same} again in {years}, {area}, {sex}",
        expected="other numbers in every year",
        remedy="Put in the year's own numbers. If a population was carried forward on purpose, "
        "say so in the note.",
        source=SOURCE,
        find=_repeated_years,
    ),
    Check(
        key="rates_repeated",
        severity="warning",
        meaning="A year has, age by age, the same death rates as another year of the same area "
        "and sex, though its counts differ.",
        why="Deaths worked out from a table of rates repeat a year where that table does.",
        found="the death rates of {same} again in {year}, {area}, {sex}",
        expected="other death rates in every year",
        remedy="Look whether the rates of the year were published at all; leave the year out if "
        "not.",
        source=SOURCE,
        find=_repeated_rates,
    ),
    Check(
        key="counts_copied",
        severity="warning",
        meaning="Several age groups in a row have the same numbers as those of another area, sex "
        "or year, more of them than chance could bring about.",
        why="Rows pasted into the wrong place are the commonest fault of tables put together by "
        "hand.",
        found="{ages} ages from {first} in {area}, {sex} {year} equal to {other_area}, "
        "{other_sex} {other_year}",
        expected="numbers of its own",
        remedy="Find out where the numbers belong and put the others right.",
        source=SOURCE,
        find=_copied,
    ),
)
