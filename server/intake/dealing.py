"""Counts dealt out over cells in proportion to what the cells have, to the last millionth.

All is done in whole millionths. What a cell is due is rounded to a millionth, and what rounding
takes or gives is carried on to the next cell, in the order of area, sex, year and age: so the cells
together get exactly what was dealt, each within a millionth of its due, in whatever order the rows
of a file stand.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace
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
    """Counts of one measure in the order of area, sex and year: lines, and their cells by age."""

    blocks: tuple[Block, ...]  # whose lines they are
    place: Ints  # [line]
    block: Ints  # [line], which of the blocks
    begins: Ints  # [line + 1], where its cells begin
    order: Ints  # [cell], where each stands when the blocks are laid one after another
    start: Ints  # [cell], age
    units: Ints  # [cell], millionths
    beside: Ints | None = None  # of one cause: those of all causes, where its own do not tell
    only: int = -1  # of one cause: the sex it befalls alone

    @classmethod
    def of(cls, blocks: Sequence[Block]) -> "Pool":
        kept = tuple(block for block in blocks if len(block.place))
        none = [np.zeros(0, np.int64)]
        place = np.concatenate(none + [block.place for block in kept])
        lines = [len(block.place) for block in kept]
        which = np.repeat(np.arange(len(kept)), lines)
        sizes = np.array([len(block.grid) for block in kept], np.int64)[which]
        order = np.argsort(place, kind="stable")
        first = np.append(0, np.cumsum(sizes))[:-1][order]
        begins = np.append(0, np.cumsum(sizes[order]))
        cells = _ranges(first, sizes[order])
        start = np.concatenate(none + [np.tile(b.grid.starts, len(b.place)) for b in kept])
        units = np.concatenate(none + [in_units(block.values).ravel() for block in kept])
        return cls(kept, place[order], which[order], begins, cells, start[cells], units[cells])

    def with_units(self, units: Ints) -> "Pool":
        return replace(self, units=units)

    def cells(self, lines: Ints) -> tuple[Ints, Ints]:
        """The cells of some lines, and which of these lines each is of."""
        sizes = np.diff(self.begins)[lines]
        return _ranges(self.begins[lines], sizes), np.repeat(np.arange(len(lines)), sizes)

    def sums(self, units: Ints) -> Ints:
        """Of the cells of each line, [line]."""
        reach = np.append(0, np.cumsum(units))
        sums: Ints = reach[self.begins[1:]] - reach[self.begins[:-1]]
        return sums

    def grid(self, lines: Ints) -> AgeGrid:
        """The finest groups that some lines have in common."""
        which: list[int] = np.unique(self.block[lines]).tolist()
        grid = self.blocks[which[0]].grid
        for block in which[1:]:
            grid = grid.common(self.blocks[block].grid)
        return grid

    def infants(self, lines: Ints) -> Flags:
        """Whether they are a group of their own, [line]."""
        own = np.array([block.grid.has(1) for block in self.blocks], bool)
        return own[self.block[lines]]

    def laid_out(self, cells: NDArray[Kind]) -> list[NDArray[Kind]]:
        """Numbers of the cells in the form of the blocks, [line, age] each."""
        flat = np.empty_like(cells)
        flat[self.order] = cells
        ends = np.cumsum([0, *(block.values.size for block in self.blocks)])
        return [
            flat[first:last].reshape(block.values.shape)
            for block, first, last in zip(self.blocks, ends[:-1], ends[1:], strict=True)
        ]


def _ranges(first: Ints, sizes: Ints) -> Ints:
    """Numbers from each first one on, so many each, one range after another."""
    before = np.cumsum(sizes) - sizes
    return np.repeat(first - before, sizes) + np.arange(int(sizes.sum()))
