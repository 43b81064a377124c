"""All equations between published counts of one period, and what they tell of withheld ones."""

from dataclasses import dataclass

import numpy as np
from scipy.sparse import csr_array

from engine.ages import Array
from server.disclosure.blocks import TOTAL, Block, linked


@dataclass(frozen=True, slots=True)
class Equations:
    """`matrix` @ counts = `right`, where counts are flattened [slot, sex]. `right` is 0 but where a
    whole was delivered with a count that is not that of its parts."""

    matrix: csr_array
    right: Array


def equations(of: Block) -> Equations:
    """Sums over age, of women and men, and over the parts of each area that has them."""
    rows: list[list[tuple[int, float]]] = []
    slots: dict[int, list[int]] = {}
    for slot, place in enumerate(of.area.tolist()):
        slots.setdefault(place, []).append(slot)
    held = of.held
    for own in slots.values():
        for sex in range(3):
            ages = [slot for slot in own if of.start[slot] != TOTAL and held[slot, sex]]
            sums = [slot for slot in own if of.start[slot] == TOTAL and held[slot, sex]]
            if sums and ages:
                rows.append([(3 * s + sex, 1.0) for s in ages] + [(3 * sums[0] + sex, -1.0)])
    for slot in np.flatnonzero(held.all(axis=1)).tolist():
        rows.append([(3 * slot, 1.0), (3 * slot + 1, 1.0), (3 * slot + 2, -1.0)])
    for sex in range(3):
        rows += _over_parts(of, sex, slots)
    index = [place for row in rows for place, _sign in row]
    signs = [sign for row in rows for _place, sign in row]
    ends = np.cumsum([0, *(len(row) for row in rows)])
    matrix = csr_array((signs, index, ends), shape=(len(rows), 3 * len(of.area)))
    return Equations(matrix, matrix @ np.nan_to_num(of.values.ravel()))


def _over_parts(of: Block, sex: int, slots: dict[int, list[int]]) -> list[list[tuple[int, float]]]:
    members = np.zeros_like(of.held)
    members[:, sex] = of.held[:, sex]
    parents = linked(of, members, members[:, sex])
    rows = []
    for whole in sorted(set(parents.values())):
        family = [whole, *(place for place, parent in parents.items() if parent == whole)]
        starts = [{int(of.start[slot]) for slot in slots[place]} for place in family]
        shared = sorted(set.intersection(*starts))
        for begin, end in zip(shared, [*shared[1:], 10**6], strict=True):
            last = begin + 1 if begin == TOTAL else end
            row = [
                (3 * slot + sex, -1.0 if place == whole else 1.0)
                for place in family
                for slot in slots[place]
                if begin <= of.start[slot] < last and of.held[slot, sex]
            ]
            rows.append(row)
    return rows
