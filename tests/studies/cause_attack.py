"""The attack on withheld deaths by cause: the tables of areas and of causes of two editions, solved
together for whole numbers of deaths.

    python -m tests.studies.cause_attack --countries 40

For each drawn country of five areas and their whole, four causes in two groups and a fifth that
nobody died of, everything that a mask shows of two editions is taken as known, and so is that a
number did not change between them. That causes add up to all deaths, groups to their causes, ages,
sexes and areas to their sums, makes the equations.
"""

import argparse
from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from scipy.optimize import Bounds, LinearConstraint, milp
from scipy.sparse import csr_array

from engine.ages import AgeGrid
from server.disclosure.masking import Content, mask
from server.store.records import Area, Cause, Key, Mask, Terms
from tests.server.disclosure.counts import FLAT, LIST, Cells, by_cause, drawn, late

YEAR, WHOLE, THRESHOLD = "2001", "n", 5


@dataclass(frozen=True, slots=True)
class Shown:
    """An edition and what of it is withheld; no list where no causes are shown."""

    areas: tuple[Area, ...]
    listed: tuple[Cause, ...]
    cells: Cells
    mask: Mask


class Name(NamedTuple):
    """An unknown: a count, which two editions share where the number is the same."""

    area: str
    cause: str
    sex: str
    start: int
    value: float


@dataclass(frozen=True, slots=True)
class Found:
    withheld: int
    small: int
    fixed: tuple[Name, ...]  # there is one solution only; a nil is no secret
    narrowed: tuple[Name, ...]  # small counts that cannot be any other small count

    @property
    def told(self) -> tuple[Name, ...]:
        """Small counts that are fixed."""
        return tuple(name for name in self.fixed if name.value < THRESHOLD)


Row = list[tuple[Name, float]]


@dataclass(slots=True)
class _System:
    rows: list[Row]
    hidden: set[Name]
    known: set[Name]


def _counts(one: Shown, area: str, cause: str, sex: str) -> dict[int, float]:
    """By start, -1 the sum; a cause without a schedule has no deaths."""
    key = Key(area, sex, YEAR, "deaths", cause)
    held = one.cells.get(key)
    if held is None:
        below = [c.code for c in one.listed if c.parent == cause]
        parts = [_counts(one, area, code, sex) for code in below]
        grid = one.cells[key._replace(cause="")].grid
        return {start: sum(part[start] for part in parts) for start in (*grid.starts, -1)}
    return {**dict(zip(held.grid.starts, held.values.tolist(), strict=True)), -1: held.values.sum()}


def _system(editions: Sequence[Shown]) -> _System:
    system = _System([], set(), set())
    for one in editions:
        grid: AgeGrid = one.cells[Key(WHOLE, "f", YEAR, "deaths")].grid

        def name(area: str, cause: str, sex: str, start: int, one: Shown = one) -> Name:
            value = float(_counts(one, area, cause, sex)[start])
            found = Name(area, cause, sex, start, value)
            gone = one.mask.get(Key(area, sex, YEAR, "deaths", cause))
            secret = gone is not None and start in gone.ages
            (system.hidden if secret else system.known).add(found)
            return found

        starts = (*grid.starts, -1)
        causes = ["", *(cause.code for cause in one.listed)]
        places = [(area.code, "") for area in one.areas]
        places += [(WHOLE, cause) for cause in causes[1:]]
        for area, cause in places:
            for sex in "fmp":
                row = [(name(area, cause, sex, start), 1.0) for start in grid.starts]
                system.rows.append([*row, (name(area, cause, sex, -1), -1.0)])
            for start in starts:
                row = [(name(area, cause, sex, start), 1.0) for sex in "fm"]
                system.rows.append([*row, (name(area, cause, "p", start), -1.0)])
        for sex in "fmp":
            for start in starts:
                parts = [area.code for area in one.areas if area.parent == WHOLE]
                row = [(name(area, "", sex, start), 1.0) for area in parts]
                system.rows.append([*row, (name(WHOLE, "", sex, start), -1.0)])
                for whole in causes:
                    below = [cause.code for cause in one.listed if cause.parent == whole]
                    if below:
                        row = [(name(WHOLE, code, sex, start), 1.0) for code in below]
                        system.rows.append([*row, (name(WHOLE, whole, sex, start), -1.0)])
    system.hidden -= system.known
    return system


def attack(editions: Sequence[Shown], *, every: int = 1) -> Found:
    """`every`: of the withheld counts the first of so many is tried."""
    system = _system(editions)
    order = sorted(system.hidden)
    place = {name: at for at, name in enumerate(order)}
    rows: list[list[tuple[int, float]]] = []
    right = []
    for row in system.rows:
        rows.append([(place[name], sign) for name, sign in row if name in place])
        right.append(-sum(sign * name.value for name, sign in row if name not in place))
    used = [at for at, row in enumerate(rows) if row]
    matrix = csr_array(
        (
            [sign for at in used for _place, sign in rows[at]],
            [one for at in used for one, _sign in rows[at]],
            np.cumsum([0, *(len(rows[at]) for at in used)]),
        ),
        shape=(len(used), len(order)),
    )
    sums = np.array([right[at] for at in used])
    fixed, narrowed, small = [], [], 0
    for at, name in list(enumerate(order))[::every]:
        least, most = _ends(matrix, sums, at, name.value)
        if least == most and name.value:
            fixed.append(name)
        if 0 < name.value < THRESHOLD:
            small += 1
            if least > 1 or most < THRESHOLD - 1:
                narrowed.append(name)
    return Found(len(order), small, tuple(fixed), tuple(narrowed))


def _ends(matrix: csr_array, sums: np.ndarray, at: int, value: float) -> tuple[float, float]:  # type: ignore[type-arg]
    """The least and the most, no farther than is asked for."""
    found = []
    upper = np.full(matrix.shape[1], np.inf)
    upper[at] = value + THRESHOLD
    for sign in (1, -1):
        goal = np.zeros(matrix.shape[1])
        goal[at] = sign
        solved = milp(
            goal,
            integrality=np.ones(len(goal)),
            bounds=Bounds(0, upper),
            constraints=LinearConstraint(matrix, sums, sums),
        )
        if solved.status != 0:
            raise AssertionError(f"what is shown contradicts itself: {solved.message}")
        found.append(float(round(sign * solved.fun)))
    return found[0], found[1]


def country(seed: int) -> tuple[Cells, Cells]:
    """Two editions; in half of the countries one area alone is revised."""
    people = (9e3, 3e3, 900.0)[seed % 3]
    first = by_cause(drawn(FLAT, seed=seed, people=people), seed=seed)
    return first, late(first, FLAT, seed, only="" if seed % 2 else "a1")


def main() -> None:
    asked = argparse.ArgumentParser(description=__doc__)
    asked.add_argument("--countries", type=int, default=10)
    asked.add_argument("--from", dest="first", type=int, default=0)
    choice = asked.parse_args()
    sums, gone = np.zeros(6, int), 0
    for seed in range(choice.first, choice.first + choice.countries):
        first, second = country(seed)
        terms = Terms(threshold=THRESHOLD)
        one = mask(FLAT, first, terms, causes=LIST)
        before = Content(FLAT, first, one.mask, one.unprotected, terms, LIST, one.by_cause)
        two = mask(FLAT, second, terms, [before], causes=LIST)
        lists = [LIST if made.by_cause else () for made in (one, two)]
        shown = [
            Shown(FLAT, listed, cells, made.mask)
            for listed, cells, made in zip(lists, (first, second), (one, two), strict=True)
        ]
        found = attack(shown)
        gone += not two.by_cause
        left = [
            sum(getattr(at, name) for made in (one, two) for at in made.unprotected.values())
            for name in ("exposed", "narrow")
        ]
        row = (
            found.withheld,
            found.small,
            len(found.fixed),
            len(found.told),
            len(found.narrowed),
            sum(left),
        )
        sums += row
        told = ("withheld", "small", "fixed", "small ones fixed", "narrowed", "said to be so")
        said = ", ".join(f"{name} {one}" for name, one in zip(told, row, strict=True))
        print(f"{seed}: {said}", flush=True)
    print(f"{choice.countries} countries: {sums.tolist()}, no causes of the second in {gone}")


if __name__ == "__main__":
    main()
