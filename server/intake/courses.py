"""Counts of one measure through the years: those handed in among those that stand."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from engine.ages import Array
from server.intake.cells import YEARS, Flags, Ints
from server.intake.ledger import Ledger
from server.intake.problems import Text
from server.intake.schedules import Block


@dataclass(frozen=True, slots=True)
class Course:
    """Vectors of one grid by place, so that the years of an area and sex stand together. The first
    column is all ages together, then come the groups of the block's grid."""

    block: Block  # what is handed in
    place: Ints  # [line]
    values: Array  # [line, 1 + age]; nan where the edition that stands has no such groups
    own: Ints  # [line], line of the block; -1: of the edition that stands

    @property
    def labels(self) -> tuple[str, ...]:
        return (Text("all ages"), *self.block.grid.labels)


def courses(ledger: Ledger, measure: str) -> Iterator[Course]:
    """One for each block of the measure. What is handed in takes the place of what stands."""
    handed = ledger.places(measure)
    past = [block for block in ledger.past if block.measure == measure]
    for block in ledger.of(measure):
        series = np.unique(block.place // YEARS)
        parts = [(block.place, _columns(block, block), np.arange(len(block.place)))]
        for other in past:
            lines = np.isin(other.place // YEARS, series) & ~np.isin(other.place, handed)
            if lines.any():
                picked = other.pick(lines)
                standing = np.full(len(picked.place), -1)
                parts.append((picked.place, _columns(picked, block), standing))
        if len(parts) == 1:
            yield Course(block, *parts[0])
            continue
        place, values, own = (np.concatenate(part) for part in zip(*parts, strict=True))
        order = np.argsort(place, kind="stable")
        yield Course(block, place[order], values[order], own[order])


def _columns(block: Block, to: Block) -> Array:
    """All ages together, then the groups of another block's grid where these can be summed so."""
    columns = np.full((len(block.place), 1 + len(to.grid)), np.nan)
    block.values.sum(axis=-1, out=columns[:, 0])
    if set(to.grid.starts) <= set(block.grid.starts):
        columns[:, 1:] = block.grid.regroup(block.values, to.grid)
    return columns


def counterpart(course: Course, ledger: Ledger, lines: Ints) -> Array:
    """Person-years beside some lines of deaths, [line, 1 + age]; nan where there are none."""
    place = course.place[lines]
    found = np.full((len(lines), 1 + len(course.block.grid)), np.nan)
    past = [block for block in ledger.past if block.measure == "person_years"]
    for block in (*past, *ledger.of("person_years")):  # what is handed in comes last, and holds
        at = np.searchsorted(block.place, place)
        here = np.flatnonzero(block.place[np.minimum(at, len(block.place) - 1)] == place)
        found[here] = _columns(block.pick(at[here]), course.block)
    return found


def runs(place: Ints) -> tuple[Ints, Ints]:
    """First line of each line's area and sex, and the one after its last, [line]."""
    series = place // YEARS
    begins = np.flatnonzero(np.append(True, series[1:] != series[:-1])[: len(series)])
    lengths = np.diff(np.append(begins, len(series)))
    return np.repeat(begins, lengths), np.repeat(begins + lengths, lengths)


def neighbours(place: Ints, steps: tuple[int, ...]) -> Iterator[tuple[Ints, Flags]]:
    """For each step the line that many lines on, and whether it is so many years off at most, of
    the same area and sex."""
    lines = np.arange(len(place))
    most = max(map(abs, steps))
    for step in steps:
        other = np.roll(lines, -step)
        apart = place[other] - place  # years, within one area and sex
        yield other, (np.sign(apart) == np.sign(step)) & (np.abs(apart) <= most)
