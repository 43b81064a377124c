"""What the edition that stands holds, as far as checks of an upload must know it."""

from collections import defaultdict
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from engine.ages import AgeGrid
from engine.panel import SEXES
from server.intake.cells import place_of
from server.intake.schedules import Block
from server.store.records import Area, Basis, Break, Cause, Key, Vector


@dataclass(frozen=True, slots=True)
class Standing:
    """The base that an upload is laid over; empty where nothing stands, or all is replaced.

    Checks read it; the schedules made of an upload do not depend on it.
    """

    areas: tuple[Area, ...] = ()  # in tree order
    held: Mapping[Key, AgeGrid] = field(default_factory=dict)  # every schedule and its age groups
    basis: Basis | None = None
    breaks: tuple[Break, ...] = ()
    cells: Mapping[Key, Vector] = field(default_factory=dict)  # deaths and person-years
    causes: tuple[Cause, ...] = ()  # deaths by them are among the cells for the newest years alone

    def without(self, codes: Collection[str]) -> "Standing":
        """The same without some areas and their counts."""
        if not codes:
            return self
        return replace(
            self,
            areas=tuple(area for area in self.areas if area.code not in codes),
            held={key: grid for key, grid in self.held.items() if key.area not in codes},
            cells={key: cell for key, cell in self.cells.items() if key.area not in codes},
        )

    def holds(self, area: str, sex: str, period: str, measure: str) -> bool:
        return Key(area, sex, period, measure) in self.held

    def blocks(self, codes: Sequence[str]) -> tuple[Block, ...]:
        """Deaths and person-years of these areas as the blocks of no file, by place."""
        number = {code: at for at, code in enumerate(codes)}
        groups: dict[tuple[str, AgeGrid], list[tuple[int, Vector]]] = defaultdict(list)
        for key, cell in self.cells.items():
            if key.area in number and not key.cause:
                place = place_of(number[key.area], SEXES.index(key.sex), int(key.period))
                groups[key.measure, cell.grid].append((place, cell))
        return tuple(_block(*of, found) for of, found in groups.items())


NOTHING_STANDS = Standing()


def _block(measure: str, grid: AgeGrid, found: list[tuple[int, Vector]]) -> Block:
    found.sort(key=lambda one: one[0])
    values = np.array([cell.values for _, cell in found])
    return Block(
        measure=measure,
        file="",
        column="",
        grid=grid,
        place=np.array([place for place, _ in found], np.int64),
        provisional=np.array([cell.status == "provisional" for _, cell in found]),
        values=values,
        row=np.zeros(values.shape, np.int64),
    )
