"""Checks for numbers that stand twice: a year repeated, rows copied from another area, sex or year.

Equal numbers prove little where they are small. How unlikely it is that a count v is met again by
chance is taken as that of a Poisson law at its middle, 1 / sqrt(4 pi v); a repetition is told where
all of its numbers together would come about once in 10,000 uploads of this size.
"""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from engine.ages import Array
from server.intake.cells import YEARS, Flags, Ints
from server.intake.checks.check import Check
from server.intake.checks.series import years_worded
from server.intake.courses import courses
from server.intake.ledger import Ledger
from server.intake.problems import Fault, Value
from server.intake.rated import rated, unsummed
from server.intake.schedules import Block

AIM = np.log(1e4)
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
    [...]. At most ten or so are taken together before the logarithm, which is dear."""
    several = np.maximum(values / unit, 1 / (4 * np.pi)).prod(axis=-1)
    return np.asarray(0.5 * (np.log(several) + values.shape[-1] * np.log(4 * np.pi)))


def _sum_of_proofs(values: Array, unit: float) -> float:
    """The same of one line of any length."""
    return float(_proof(values[:, None], unit).sum())


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
        for course in courses(ledger, measure):
            ages = course.values[:, 1:]
            marks = _marks(ages, 1).sum(axis=-1)
            series = course.place // YEARS
            if len(np.unique(marks)) == len(marks):
                continue
            twice = _pairs(marks * 1_000_003 + series, np.lexsort((course.place, marks, series)))
            least = AIM + np.log(max(len(marks), 2))
            unit = _unit(course.block.values)
            for line, same in _by_first(twice):
                own = course.own[np.append(line, same)]
                known = np.isfinite(ages[same]).all() and (own >= 0).any()
                if known and _sum_of_proofs(ages[same], unit) > least:
                    own = own[own >= 0]
                    yield _repeated(
                        ledger, course.block, own, course.place[line], course.place[same]
                    )


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
        before, after = order[:-1], order[1:]
        close = (one.place[before] // YEARS == one.place[after] // YEARS) & (
            np.abs(whole[after] - whole[before]) <= 1e-8 * whole[after]
        )
        for a, b in zip(before[close].tolist(), after[close].tolist(), strict=True):
            first, second = sorted((a, b))
            met = one.deaths[first] > 0
            alike = np.abs(one.rates[first] - one.rates[second]) <= 1e-7 * one.rates[first]
            differ = (one.people[first] != one.people[second]).any()
            enough = _sum_of_proofs(one.deaths[first], 1.0) > AIM + np.log(len(whole))
            if differ and enough and (alike | ~met).all() and met.any():
                values: dict[str, Value] = {"same": str(int(one.place[first]) % YEARS)}
                yield one.fault(ledger, second, 0, values)


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
    told: set[tuple[int, int]] = set()
    for width in WINDOWS:
        many = values.shape[-1] // width
        if not many:
            continue
        cut = (len(lines), many, width)
        keys = marks[:, : many * width].reshape(cut).sum(axis=-1).ravel()
        sure = _proof(values[:, : many * width].reshape(cut), unit).ravel()
        at = np.flatnonzero(sure > AIM + 2 * np.log(max(len(keys), 2)) - np.log(2))
        ordered = np.sort(keys[at])
        if not (ordered[1:] == ordered[:-1]).any():
            continue
        twice = _pairs(keys[at], np.lexsort((at, keys[at])))
        for line, same in zip(
            (at[twice.line] // many).tolist(), (at[twice.same] // many).tolist(), strict=True
        ):
            pair = (int(lines[line]), int(lines[same]))
            equal = values[line] == values[same]
            whole_year = (
                equal.all() and block.place[pair[0]] // YEARS == block.place[pair[1]] // YEARS
            )
            if pair not in told and not whole_year:
                told.add(pair)
                yield _copy(ledger, block, *pair, equal & (values[line] > 0))


def _copy(ledger: Ledger, block: Block, line: int, same: int, equal: Flags) -> Fault:
    ages = np.flatnonzero(equal)
    other = ledger.named(int(block.place[same]))
    values: dict[str, Value] = {
        "ages": len(ages),
        "first": block.grid.labels[int(ages[0])],
        "other_area": other["area"],
        "other_sex": other["sex"],
        "other_year": other["year"],
    }
    return block.fault(block.row[line, ages], ledger.named(int(block.place[line])) | values)


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
