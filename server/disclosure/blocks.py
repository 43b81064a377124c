"""The counts of one period, cell by cell, and the equations that everything published obeys.

A *slot* is an age group of an area, or the sum over its ages (start -1); it holds a count of women,
men and persons. Counts add up over ages, over sexes and over the parts of an area. Where only one
or two sexes of a slot may move together (a *mode*), these equations are those of a network: an area
without parts is a node (its ages add up to its sum), and so is every age group, and the sum, of an
area with parts (they add up over its parts); a slot is the edge between the two equations it stands
in. So a withheld slot can be worked out exactly where it is a bridge of the withheld ones.
"""

from bisect import bisect_right
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import reduce

import numpy as np
from numpy.typing import NDArray

from engine.ages import AgeGrid, Array
from server.store.records import Area, Key, Vector

TOTAL = -1  # start of the slot of a sum over age
SEXES = ("f", "m", "p")
# which sexes move together, so that what is published of the third does not
MODES: tuple[tuple[int, ...], ...] = ((0, 2), (1, 2), (0, 1))
WHOLE_OF_PARTS = 0.9  # parts with a smaller share of the deaths are no account of their area

Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Block:
    """One period and measure. [slot] and [slot, sex]; nan where nothing is held."""

    areas: tuple[Area, ...]  # in tree order
    grids: Mapping[tuple[int, int], AgeGrid]  # of (area, sex): own groups, each within one slot
    area: Ints  # [slot], place in `areas`
    start: Ints  # [slot]
    stop: Ints  # [slot], where the next group begins; -1: open, or a sum
    values: Array  # [slot, sex]
    least: Array  # [slot, sex], the smallest count above 0 that is published of it
    exposure: Array  # [slot, sex], person-years; nan where not held
    inner: Bools  # [slot], of an area that has parts

    @property
    def held(self) -> Bools:
        return np.asarray(~np.isnan(self.values))

    def keys(self) -> dict[tuple[str, int, int], int]:
        """(area, start, stop) to slot."""
        codes = [one.code for one in self.areas]
        return {
            (codes[area], start, stop): slot
            for slot, (area, start, stop) in enumerate(
                zip(self.area.tolist(), self.start.tolist(), self.stop.tolist(), strict=True)
            )
        }


def block(
    areas: tuple[Area, ...],
    period: str,
    measure: str,
    cells: Mapping[Key, Vector],
    *,
    counted: str = "",
) -> Block:
    """The schedules of one period and measure as slots. `counted` names a measure whose counts, of
    the same people, are published as well."""
    grids: dict[tuple[int, int], AgeGrid] = {}
    parts: list[tuple[Ints, Ints, Array, Array, Array]] = []
    places: list[int] = []
    for place, area in enumerate(areas):
        own = {
            sex: cells[key]
            for sex, code in enumerate(SEXES)
            if (key := Key(area.code, code, period, measure)) in cells
        }
        if not own:
            continue
        grids |= {(place, sex): vector.grid for sex, vector in own.items()}
        keys = {sex: Key(area.code, SEXES[sex], period, measure) for sex in own}
        beside = {sex: cells.get(_as(key, counted)) for sex, key in keys.items()}
        years = {sex: cells.get(_as(key, "person_years")) for sex, key in keys.items()}
        parts.append(_slots(own, beside, years))
        places.append(place)
    inner = {area.parent for area in areas}
    lengths = [len(part[0]) for part in parts]
    of = np.repeat(np.array(places, int), lengths)
    start, stop, values, least, exposure = (
        np.concatenate([part[at] for part in parts]) if parts else np.zeros((0, 3)[: 1 + (at > 1)])
        for at in range(5)
    )
    return Block(
        areas=areas,
        grids=grids,
        area=of,
        start=start.astype(int),
        stop=stop.astype(int),
        values=values,
        least=least,
        exposure=exposure,
        inner=np.array([areas[at].code in inner for at in of.tolist()], np.bool_),
    )


def _as(key: Key, measure: str) -> Key:
    return Key(key.area, key.sex, key.period, measure, key.cause)


def _slots(
    own: Mapping[int, Vector],
    counted: Mapping[int, Vector | None],
    years: Mapping[int, Vector | None],
) -> tuple[Ints, Ints, Array, Array, Array]:
    """Of one area: starts, stops, values, smallest counts and person-years."""
    grid = reduce(AgeGrid.common, (vector.grid for vector in own.values()))
    starts = np.array(grid.starts)
    stops = np.append(starts[1:], -1)
    values, least, exposure = (np.full((len(grid), 3), np.nan) for _part in range(3))
    for sex, vector in own.items():
        values[:, sex] = vector.grid.regroup(vector.values, grid)
        smallest = _smallest(vector, grid)
        other = counted.get(sex)
        if other is not None and set(grid.starts) <= set(other.grid.starts):
            smallest = np.fmin(smallest, _smallest(other, grid))
        least[:, sex] = smallest
        lived = years.get(sex)
        if lived is not None and set(grid.starts) <= set(lived.grid.starts):
            exposure[:, sex] = lived.grid.regroup(lived.values, grid)
    if len(grid) == 1:
        return starts, stops, values, least, exposure
    sums = [np.nansum(values, axis=0), np.nansum(exposure, axis=0)]
    sums = [np.where(np.isnan(values).all(axis=0), np.nan, one) for one in sums]
    return (
        np.append(starts, TOTAL),
        np.append(stops, -1),
        np.vstack([values, sums[0]]),
        np.vstack([least, np.where(sums[0] > 0, sums[0], np.nan)]),
        np.vstack([exposure, sums[1]]),
    )


def _smallest(vector: Vector, grid: AgeGrid) -> Array:
    """The smallest count above 0 of each group or within it; nan where all are 0."""
    above = np.where(vector.values > 0, vector.values, np.inf)
    found = np.minimum.reduceat(above, [vector.grid.position(start) for start in grid.starts])
    return np.where(np.isfinite(found), found, np.nan)


@dataclass(frozen=True, slots=True)
class Network:
    """A mode's equations as nodes, its slots as edges: [slot]; -1 where a slot has no part."""

    nodes: int
    tail: Ints
    head: Ints
    members: Bools  # [slot, sex], which counts of the slot move


def network(of: Block, mode: Iterable[int]) -> Network:
    """Who moves with whom in this mode, and through which equations."""
    sexes = np.zeros(3, bool)
    sexes[list(mode)] = True
    members = of.held & sexes
    both = members.sum(axis=1) == sexes.sum()
    alone = of.held.sum(axis=1) == 1
    used = both | (alone & members.any(axis=1))
    parents = linked(of, members, used)
    names: dict[tuple[int, ...], int] = {(): 0}  # the ground: equations the others imply

    def node(*name: int) -> int:
        return names.setdefault(name, len(names))

    shared = _shared_starts(of, parents, used)
    tail, head = np.full(len(of.area), -1), np.full(len(of.area), -1)
    sums = {place: len(shared_own) > 1 for place, shared_own in _own_starts(of).items()}
    has_parts = set(parents.values())
    for slot in np.flatnonzero(used).tolist():
        place, start = int(of.area[slot]), int(of.start[slot])
        if place in has_parts:
            tail[slot] = node(place, _within(shared[place], start))
        else:
            tail[slot] = node(place, -2) if sums[place] else 0
        parent = parents.get(place)
        head[slot] = 0 if parent is None else node(parent, _within(shared[parent], start))
    return Network(len(names), tail, head, members & used[:, None])


def linked(of: Block, members: Bools, used: Bools) -> dict[int, int]:
    """Area to the one it is part of, where the two can be set against each other: the whole has the
    same sexes, and its parts make up most of it."""
    codes = {area.code: place for place, area in enumerate(of.areas)}
    sums: dict[int, float] = {}
    sexes: dict[int, tuple[bool, ...]] = {}
    for place in np.unique(of.area[used]).tolist():
        rows = used & (of.area == place)
        ages = rows & ((of.start != TOTAL) | (rows.sum() == 1))
        sums[place] = float(np.nansum(np.where(members[ages], of.values[ages], 0.0)))
        sexes[place] = tuple(members[ages].any(axis=0).tolist())
    together: dict[int, float] = {}
    found = {}
    for place in sums:
        parent = codes.get(of.areas[place].parent)
        if parent is not None and sexes.get(parent) == sexes[place]:
            found[place] = parent
            together[parent] = together.get(parent, 0.0) + sums[place]
    return {
        place: parent
        for place, parent in found.items()
        if together[parent] >= WHOLE_OF_PARTS * sums[parent]
    }


def _own_starts(of: Block) -> dict[int, list[int]]:
    own: dict[int, list[int]] = {}
    for place, start in zip(of.area.tolist(), of.start.tolist(), strict=True):
        own.setdefault(place, []).append(start)
    return own


def _shared_starts(of: Block, parents: Mapping[int, int], used: Bools) -> dict[int, list[int]]:
    """Of each area with parts: where the groups begin that it and its parts can be summed to."""
    own = _own_starts(of)
    shared: dict[int, set[int]] = {}
    for place, parent in parents.items():
        both = set(own[place]) & set(own[parent])
        shared[parent] = shared.get(parent, both) & both
    return {place: sorted(starts) for place, starts in shared.items()}


def _within(starts: list[int], start: int) -> int:
    """The group of these that holds an age group; a sum is a group of its own."""
    if start == TOTAL:
        return TOTAL
    return starts[bisect_right(starts, start) - 1]
