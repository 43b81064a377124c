"""Counts rounded at random, the alternative to withholding some of them.

A count x of a cell is given as b floor((x + s) / b): the multiple of the base b below or above it,
above with a chance of (x mod b) / b, so that nothing is added or taken away on average (random
rounding: Nargundkar & Saveland (1972), Proceedings of the Social Statistics Section, American
Statistical Association, 382-385; Fellegi (1975), Survey Methodology 1:123-133; Willenborg & de Waal
(2001), Elements of Statistical Disclosure Control, ch. 9). The shift s, from 0 up to b, is drawn
once for a cell from a secret of the collection and the name of the cell, and never again. So x
reaches what is shown only in the sum x + s: b neighbouring counts give the same in every edition,
even to a reader who knows by how much each revision moved it, and no average helps.

Rounded are the counts that add up to all others, each by itself: of areas without parts, of women
and of men, at each age. Every sum is the sum of these rounded counts. Sums rounded by themselves
would be nearer the truth and could tell a count, as where five cells are each rounded up and their
sum is rounded down; controlled rounding (Cox (1987), Journal of the American Statistical
Association 82:520-524) lets a cell depend on its neighbours, so that it would be rounded anew with
them. What a whole was delivered with beyond its parts, and deaths of unknown sex, are cells too.
"""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import reduce
from hashlib import blake2b
from typing import NamedTuple

import numpy as np

from engine.ages import AgeGrid, Array
from server.disclosure.blocks import TOTAL
from server.store.records import Area, Hidden, Key, Vector

BASES = (3, 5, 10)
MEASURES = ("deaths", "births", "stillbirths", "neonatal_deaths")
UNKNOWN = "u"  # what persons are more than women and men
_NOTHING = 1e-6  # what is left of sums of counts that are equal
_EVERY_AGE = AgeGrid(tuple(range(131)))
Cells = Mapping[Key, Vector]


class Atom(NamedTuple):
    """Cells that are rounded by themselves: an area, or what it has beyond its parts."""

    area: str
    sex: str
    starts: tuple[int, ...]
    parts: frozenset[str]


@dataclass(frozen=True, slots=True)
class Rounding:
    """How to: the base, and the secret that shifts are drawn with."""

    base: int
    secret: str

    def shown(self, counts: Array, names: Iterable[str]) -> Array:
        """Each count as it is given under the name of its cell; nan and nil stay."""
        near = np.where(np.abs(counts) < _NOTHING, 0.0, counts)
        shifts = np.array([self._shift(name) for name in names])
        return np.asarray(self.base * np.floor((near + shifts) / self.base))

    def _shift(self, name: str) -> float:
        drawn = blake2b(name.encode(), digest_size=6, key=self.secret.encode()[:64]).digest()
        return self.base * int.from_bytes(drawn) / 256**6


@dataclass(frozen=True, slots=True)
class Rounded:
    """Schedules of one period and measure as they are given, and what they are made of."""

    cells: dict[Key, Vector]
    atoms: frozenset[Atom]


Sexes = dict[tuple[str, str], Vector]  # of area and sex


def rounded(
    areas: Iterable[Area], period: str, measure: str, cells: Cells, how: Rounding
) -> Rounded:
    """The schedules of a period and measure that can be given. Where some areas hold sexes that
    others do not, a sum could be made of its parts in more than one way: persons alone are given,
    or nothing."""
    held = {
        (key.area, key.sex): vector
        for key, vector in cells.items()
        if (key.period, key.measure, key.cause) == (period, measure, "")
    }
    own = held if _alike(held) else _persons(held)
    work = _Work(period, measure, how, _parts(areas, own), _with_unknown(own))
    found: dict[Key, Vector] = {}
    for area, sex in own:
        if (area, sex) in held:
            grid, values = work.summed(area, ("f", "m", UNKNOWN) if sex == "p" else (sex,))
            counts = np.maximum(values, 0.0)  # a whole may count fewer than its parts
            given = replace(own[area, sex], grid=grid, values=counts, rounded=how.base)
            found[Key(area, sex, period, measure)] = given
    return Rounded(found, frozenset(work.atoms))


def _alike(own: Sexes) -> bool:
    """Whether all areas hold the same sexes; persons add nothing to women and men."""
    kinds: dict[str, frozenset[str]] = {}
    for area, sex in own:
        kinds[area] = kinds.get(area, frozenset()) | {sex}
    return len({kind - {"p"} if len(kind) == 3 else kind for kind in kinds.values()}) < 2


def _persons(own: Sexes) -> Sexes:
    """Of every area, summed where they are not held; nothing where an area has one sex alone."""
    found: Sexes = {}
    for area in dict.fromkeys(area for area, _sex in own):
        sexes = [own[area, sex] for sex in ("f", "m") if (area, sex) in own]
        if (area, "p") in own:
            found[area, "p"] = own[area, "p"]
        elif len(sexes) == 2:
            grid = sexes[0].grid.common(sexes[1].grid)
            found[area, "p"] = replace(sexes[0], grid=grid, values=_sum(grid, sexes))
        else:
            return {}
    return found


def _sum(grid: AgeGrid, parts: Iterable[Vector]) -> Array:
    return np.asarray(
        sum((one.grid.regroup(one.values, grid) for one in parts), np.zeros(len(grid)))
    )


def _parts(areas: Iterable[Area], own: Sexes) -> dict[str, list[str]]:
    """Of each area with counts the parts with counts; what lies between and has none is passed."""
    parents = {area.code: area.parent for area in areas}
    held = {area for area, _sex in own}
    found: dict[str, list[str]] = {}
    for area in sorted(held):
        whole = parents.get(area, "")
        while whole and whole not in held:
            whole = parents.get(whole, "")
        found.setdefault(whole, []).append(area)
    return found


def _with_unknown(own: Sexes) -> Sexes:
    """Women, men, and what persons are more than these."""
    found = {name: vector for name, vector in own.items() if name[1] != "p"}
    for (area, sex), persons in own.items():
        if sex == "p":
            known = [own[area, one] for one in ("f", "m") if (area, one) in own]
            grid = reduce(AgeGrid.common, (one.grid for one in known), persons.grid)
            rest = persons.grid.regroup(persons.values, grid) - _sum(grid, known)
            found[area, UNKNOWN] = replace(persons, grid=grid, values=rest)
    return found


class _Work:
    """Rounds each area once, its parts first."""

    def __init__(
        self,
        period: str,
        measure: str,
        how: Rounding,
        parts: Mapping[str, Sequence[str]],
        own: Sexes,
    ) -> None:
        self.period, self.measure, self.how, self.parts, self.own = period, measure, how, parts, own
        self.done: Sexes = {}
        self.atoms: set[Atom] = set()

    def summed(self, area: str, sexes: Iterable[str]) -> tuple[AgeGrid, Array]:
        """What is given of those sexes together that the area has."""
        given = [self.of(area, sex) for sex in sexes if (area, sex) in self.own]
        grid = reduce(AgeGrid.common, (one.grid for one in given))
        return grid, _sum(grid, given)

    def of(self, area: str, sex: str) -> Vector:
        """What is given of an area: its parts as these are given, and the rest rounded."""
        if (area, sex) not in self.done:
            inside = [one for one in self.parts.get(area, ()) if (one, sex) in self.own]
            given = [self.of(one, sex) for one in inside]
            held = self.own[area, sex]
            grid = reduce(AgeGrid.common, (one.grid for one in given), held.grid)
            counted = _sum(grid, (self.own[one, sex] for one in inside))
            rest = held.grid.regroup(held.values, grid) - counted
            values = _sum(grid, given) + self.how.shown(rest, self._names(area, sex, grid, inside))
            self.done[area, sex] = replace(held, grid=grid, values=values)
        return self.done[area, sex]

    def _names(self, area: str, sex: str, grid: AgeGrid, inside: Sequence[str]) -> list[str]:
        """Names of the cells, by which their shifts are drawn. Deaths of the first 28 days take
        that of the infants they are among, so that they never are more."""
        self.atoms.add(Atom(area, sex, grid.starts, frozenset(inside)))
        early = self.measure == "neonatal_deaths"
        stops = [1] if early and len(grid) == 1 else [*grid.starts[1:], TOTAL]
        of = (self.period, "deaths" if early else self.measure, area, sex, *inside)
        return [
            "\x1f".join((*of, str(start), str(stop)))
            for start, stop in zip(grid.starts, stops, strict=True)
        ]


Year = tuple[Sequence[Area], Cells]  # what an edition has of a period


def rounding(
    areas: Sequence[Area], period: str, cells: Cells, how: Rounding, earlier: Iterable[Year] = ()
) -> dict[Key, Hidden]:
    """How all counts of a period are given when `earlier` editions gave theirs.

    Cells are rounded by themselves as long as all that were so rounded before still are. Where some
    are parted or put together in another way, a second rounding of the same people could tell them:
    the counts of that edition and year are withheld, and what was given before stands in.
    """
    found: dict[Key, Hidden] = {}
    past = list(earlier)
    for measure in MEASURES:
        keys = [key for key in cells if key.measure == measure and not key.cause]
        if not keys:
            continue
        atoms: frozenset[Atom] = frozenset()
        last: Mapping[Key, Vector] = {}
        for then, counts in past:
            before = rounded(then, period, measure, counts, how)
            if atoms <= before.atoms:
                atoms, last = atoms | before.atoms, before.cells
        now = rounded(areas, period, measure, cells, how)
        given = now.cells if atoms <= now.atoms else {}
        rates = _Rates(given or last, cells)
        for key in keys:
            found[key] = (
                _given(cells[key], given[key])
                if key in given
                else _withheld(key, cells[key], last.get(key), rates)
            )
    return found | _as_counted(cells, found)


def on_coarser(hidden: Hidden, held: AgeGrid, to: AgeGrid) -> Hidden:
    """Rounded numbers of a schedule summed into the groups that they share with coarser ones."""
    grid = AgeGrid(hidden.starts) if hidden.starts else held
    shared = grid.common(to)
    values = grid.regroup(np.array(hidden.values), shared)
    return replace(hidden, ages=shared.starts, values=tuple(values.tolist()), starts=shared.starts)


def _given(held: Vector, given: Vector) -> Hidden:
    starts = given.grid.starts
    coarser = () if starts == held.grid.starts else starts
    return Hidden(starts, tuple(given.values.tolist()), coarser, given.rounded)


def _withheld(key: Key, held: Vector, last: Vector | None, rates: "_Rates") -> Hidden:
    same = last is not None and last.grid == held.grid
    values = last.values if last is not None and same else rates.expected(key, held.grid)
    total = round(float(np.nansum(values)), 9)
    return Hidden((*held.grid.starts, TOTAL), (*(round(one, 9) for one in values.tolist()), total))


def _as_counted(cells: Cells, found: Mapping[Key, Hidden]) -> dict[Key, Hidden]:
    """Counts from which chance is told are given as the rounded ones they stand behind."""
    out: dict[Key, Hidden] = {}
    for key, hidden in found.items():
        beside = key._replace(measure="counted_deaths")
        if key.measure == "deaths" and beside in cells:
            starts = hidden.starts or cells[key].grid.starts
            own = cells[beside].grid.starts
            out[beside] = replace(hidden, starts=() if starts == own else starts)
    return out


class _Rates:
    """Counts by person-years of all schedules that are given, on the ages they share."""

    def __init__(self, given: Mapping[Key, Vector], cells: Cells) -> None:
        self.cells = cells
        pairs = [
            (one, cells[lived])
            for key, one in given.items()
            if (lived := key._replace(measure="person_years")) in cells
        ]
        self.grid = reduce(AgeGrid.common, (one.grid for pair in pairs for one in pair), _EVERY_AGE)
        counts = _sum(self.grid, (one for one, _years in pairs))
        years = _sum(self.grid, (one for _count, one in pairs))
        with np.errstate(all="ignore"):
            self.rate = np.nan_to_num(counts / years) if pairs else None

    def expected(self, key: Key, grid: AgeGrid) -> Array:
        """People times the rate at their age; 1 where either is not known."""
        lived = self.cells.get(key._replace(measure="person_years"))
        if self.rate is None or lived is None or not set(grid.starts) <= set(lived.grid.starts):
            return np.ones(len(grid))
        place = np.searchsorted(self.grid.starts, grid.starts, side="right") - 1
        return np.asarray(lived.grid.regroup(lived.values, grid) * self.rate[place])
