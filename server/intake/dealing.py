"""Counts dealt out over cells in proportion to what the cells have, to the last millionth.

All is done in whole millionths. What a cell is due is rounded to a millionth, and what rounding
takes or gives is carried on to the next cell, in the order of area, sex, year and age: so the cells
together get exactly what was dealt, each within a millionth of its due, in whatever order the rows
of a file stand.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import reduce
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from engine.ages import AgeGrid, Array
from server.intake.cells import Flags, Ints
from server.intake.schedules import DECIMALS, Block

UNIT = 10**DECIMALS
Kind = TypeVar("Kind", np.int64, np.bool_)


def in_units(counts: Array) -> Ints:
    """Counts in whole millionths."""
    units: Ints = np.rint(counts * UNIT).astype(np.int64)
    return units


def dealt(amounts: Ints, bins: Ints, weights: Ints) -> Ints:
    """What each cell gets of the amount of its bin, in proportion to its weight.

    Shape:   amounts [bin], bins and weights [cell], weights at least 0 -> [cell].
    Missing: the amount of a bin without weight is not dealt.
    >>> dealt(np.array([10, 5]), np.array([0, 0, 0, 1]), np.array([1, 1, 1, 0])).tolist()
    [3, 4, 3, 0]
    """
    order = np.argsort(bins, kind="stable")
    bin_of, reach = bins[order], np.cumsum(weights[order])
    totals = np.zeros(len(amounts), np.int64)
    np.add.at(totals, bins, weights)
    within = reach - (np.cumsum(totals) - totals)[bin_of]
    with np.errstate(invalid="ignore"):
        due = amounts[bin_of] * (within / totals[bin_of])
    up_to = np.rint(np.where(totals[bin_of] > 0, due, 0.0)).astype(np.int64)
    first = np.append(True, bin_of[1:] != bin_of[:-1])[: len(bin_of)]
    given = np.empty_like(up_to)
    given[order] = up_to - np.where(first, 0, np.roll(up_to, 1))
    return given


@dataclass(frozen=True, slots=True)
class Pool:
    """Counts of one measure, cell by cell in the order of area, sex, year and age: [cell]."""

    blocks: tuple[Block, ...]  # whose cells they are
    order: Ints  # where each stands when the blocks are laid one after another
    place: Ints
    start: Ints
    line: Ints  # cells of one place share it
    adult: Flags  # no infants, or these with older ones
    units: Ints

    @classmethod
    def of(cls, blocks: Sequence[Block]) -> "Pool":
        kept = tuple(block for block in blocks if len(block.place))
        none = [np.zeros(0, np.int64)]
        place = np.concatenate(none + [np.repeat(b.place, len(b.grid)) for b in kept])
        start = np.concatenate(none + [np.tile(b.grid.starts, len(b.place)) for b in kept])
        infants = np.concatenate(none + [np.full(b.values.size, b.grid.has(1)) for b in kept])
        units = np.concatenate(none + [in_units(b.values).ravel() for b in kept])
        order = np.lexsort((start, place))
        place, start = place[order], start[order]
        begins = np.append(True, place[1:] != place[:-1])[: len(place)]
        adult = (start > 0) | (infants[order] == 0)
        return cls(kept, order, place, start, np.cumsum(begins) - 1, adult, units[order])

    def with_units(self, units: Ints) -> "Pool":
        return replace(self, units=units)

    def at_all_ages(self) -> Ints:
        """What the cells of each cell's line have together, [cell]."""
        sums = np.zeros(len(self.units), np.int64)
        np.add.at(sums, self.line, self.units)
        return sums[self.line]

    def grid(self, cells: Flags) -> AgeGrid:
        """The finest groups that the lines of these cells have in common."""
        laid = zip(self.blocks, self.laid_out(cells), strict=True)
        return reduce(AgeGrid.common, (block.grid for block, here in laid if here.any()))

    def laid_out(self, cells: NDArray[Kind]) -> list[NDArray[Kind]]:
        """Numbers of the cells in the form of the blocks, [line, age] each."""
        flat = np.empty_like(cells)
        flat[self.order] = cells
        ends = np.cumsum([0, *(block.values.size for block in self.blocks)])
        return [
            flat[first:last].reshape(block.values.shape)
            for block, first, last in zip(self.blocks, ends[:-1], ends[1:], strict=True)
        ]
