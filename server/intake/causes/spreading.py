"""Deaths by cause that do not state their sex, age or area, shared out cause by cause.

Each cause is shared out by its own stated deaths, by the rule of its file; where it was stated
nowhere, by those of all causes. The deaths of all causes are then the sum over the causes, to the
last millionth.
"""

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from engine.ages import Array
from engine.panel import SEXES
from server.intake.causes.parting import ByCause
from server.intake.cells import Ints
from server.intake.dealing import UNIT, in_units
from server.intake.ledger import Ledger
from server.intake.schedules import Aside, Block
from server.intake.sharing import Settled, is_settled, settle

WITHOUT = -1  # in place of a leaf: deaths of all causes that have none


@dataclass(frozen=True, slots=True)
class Spread:
    """Deaths of one file by leaves, when what does not state its sex, age or area is shared out."""

    by_cause: ByCause
    deaths: dict[int, Array]  # by leaf, [cell]
    counted: dict[int, Array]  # of them as counted and stated; empty: nothing was shared out

    @property
    def file(self) -> str:
        return self.by_cause.file

    @property
    def codes(self) -> dict[int, str]:
        """Leaves that have deaths, and their codes."""
        causes = self.by_cause.items.list.causes
        return {leaf: causes[leaf].code for leaf in self.deaths if leaf != WITHOUT}

    def block(self, block: Block, leaf: int) -> Block:
        """A block of all causes with the deaths of one."""
        at = _cells(self.by_cause, block)
        counted = self.counted[leaf][at] if self.counted else None
        return replace(block, values=self.deaths[leaf][at], counted=counted)

    def together(self, block: Block) -> Block:
        """A block with the sum over all causes."""
        if not self.counted:
            return block
        units = sum((in_units(of) for of in self.deaths.values()), start=np.zeros(1, np.int64))
        values = (units / UNIT)[_cells(self.by_cause, block)]
        return replace(block, values=np.where(values == block.values, block.values, values))


def by_leaves(settled: Settled, parted: Sequence[ByCause]) -> tuple[Settled, tuple[Spread, ...]]:
    """What was settled for all causes made the sum over the causes, and the deaths by cause."""
    found = tuple(_by_leaf(settled.delivered, one) for one in parted)
    of_file = {one.file: one for one in found}
    blocks = tuple(
        of_file[block.file].together(block)
        if block.measure == "deaths" and block.file in of_file
        else block
        for block in settled.ledger.blocks
    )
    return replace(settled, ledger=replace(settled.ledger, blocks=blocks)), found


def _by_leaf(delivered: Ledger, by_cause: ByCause) -> Spread:
    leaves = [*by_cause.leaves, *([WITHOUT] if by_cause.rest.any() else [])]
    ledger = _of_file(delivered, by_cause)
    if is_settled(ledger):
        return Spread(by_cause, {leaf: by_cause.of(leaf) for leaf in leaves}, {})
    deaths, counted = {}, {}
    for leaf in leaves:
        values = by_cause.of(leaf)
        sex = "" if leaf == WITHOUT else by_cause.items.list.causes[leaf].sex
        done = settle(_with(ledger, by_cause, values), ledger, SEXES.index(sex) if sex else -1)
        deaths[leaf] = np.zeros(len(values))
        for block in done.ledger.blocks:
            deaths[leaf][_cells(by_cause, block)] = block.values
        counted[leaf] = values
    return Spread(by_cause, deaths, counted)


def _of_file(ledger: Ledger, by_cause: ByCause) -> Ledger:
    """The deaths of one file alone."""

    def own(asides: Iterable[Aside]) -> tuple[Aside, ...]:
        return tuple(one for one in asides if _is_of(one, by_cause))

    return replace(
        ledger,
        blocks=tuple(block for block in ledger.blocks if _is_of(block, by_cause)),
        age_totals=own(ledger.age_totals),
        ageless=own(ledger.ageless),
        grouped=own(ledger.grouped),
    )


def _is_of(source: Block | Aside, by_cause: ByCause) -> bool:
    return source.measure == "deaths" and source.file == by_cause.file


def _with(ledger: Ledger, by_cause: ByCause, values: Array) -> Ledger:
    """The same with the deaths of one cause."""

    def own(asides: Iterable[Aside]) -> Iterator[Aside]:
        for one in asides:
            yield replace(one, values=values[_cells(by_cause, one)])

    return replace(
        ledger,
        blocks=tuple(
            replace(block, values=values[_cells(by_cause, block)]) for block in ledger.blocks
        ),
        age_totals=tuple(own(ledger.age_totals)),
        ageless=tuple(own(ledger.ageless)),
        grouped=tuple(own(ledger.grouped)),
    )


def _cells(by_cause: ByCause, source: Block | Aside) -> Ints:
    """Which cells of the file its numbers stand in."""
    found: Ints = np.searchsorted(by_cause.row, source.row)
    return found
