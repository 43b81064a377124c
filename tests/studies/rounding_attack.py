"""The attack on rounded counts: everything a reader can fetch of two editions, solved for whole
numbers of deaths.

    python -m tests.studies.rounding_attack --collections 20 --base 3

The countries are those of the attack on withheld counts. The reader knows how rounding is done, all
but the secret; that sums over ages, sexes and areas hold; which counts did not change between the
editions; and, which no page tells, by how much each of the others did. What the twins of every
population-year and curve tell of a count is taken as a bound of its rounded number. Then the least
and the most that each count of women or men in an area without parts can be is searched for:
whole-number programmes over counts and shifts, one shift for a count in both editions.
"""

import argparse
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from scipy.optimize import Bounds, LinearConstraint, milp
from scipy.sparse import coo_array

from server.disclosure.blocks import TOTAL
from server.results.releasing import released
from server.store.connect import Session
from server.store.records import Selection, Terms
from tests.studies.attack import (
    CODE,
    PARENTS,
    Facts,
    country,
    harvest,
    questions,
    shown,
)

EDITIONS = (1, 2)
Cell = tuple[str, str, int]  # area without parts, women or men, start of the group
Shown = Mapping[Cell, float]


@dataclass(frozen=True, slots=True)
class Found:
    counts: int
    fewest: int  # numbers that some count may be, of those that may not be 0
    narrow: tuple[Cell, ...]  # may be fewer numbers than the base, and is not next to 0
    beyond: tuple[object, ...]  # told by a page, and not by the rounded counts


def attack(session: Session, facts: Facts, base: int) -> Found:
    """The truth gives the moves between the editions, and judges the result."""
    truth = [numbers(session, number, "full") for number in EDITIONS]
    shows = [numbers(session, number, "released") for number in EDITIONS]
    return solved(truth, shows, facts, base)


def solved(truth: Sequence[Shown], shows: Sequence[Shown], facts: Facts, base: int) -> Found:
    cells = list(truth[0])
    count = len(cells)
    moves = np.array([truth[1][cell] - truth[0][cell] for cell in cells])
    # unknowns: count in the first edition, then shift; together they lie in the number's multiple
    both = coo_array(np.hstack([np.eye(count), np.eye(count)]))
    rules = [
        LinearConstraint(both, low - move, low + base - 1 - move)
        for one, move in zip(shows, (0 * moves, moves), strict=True)
        for low in (np.array([one[cell] for cell in cells]),)
    ]
    floor = np.maximum(-moves, 0.0)
    limits = Bounds(
        np.append(floor, np.zeros(count)),
        np.append(np.full(count, np.inf), np.full(count, base - 1.0)),
    )
    fewest, narrow = 2 * base, []
    for at, cell in enumerate(cells):
        least, most = _ends(at, rules, limits)
        assert least <= truth[0][cell] <= most, cell
        if least > floor[at]:
            fewest = min(fewest, int(most - least) + 1)
            narrow += [cell] if most - least + 1 < base else []
    return Found(count, fewest, tuple(narrow), beyond(facts, shows))


def numbers(session: Session, edition: int, figures: str) -> Shown:
    cells = released(session, CODE, edition, Selection(measures=("deaths",)), figures)
    return {
        (key.area, key.sex, start): float(value)
        for key, vector in cells.items()
        if key.area in PARENTS and key.sex != "p"
        for start, value in zip(vector.grid.starts, vector.values, strict=True)
    }


def _ends(at: int, rules: list[LinearConstraint], limits: Bounds) -> tuple[float, float]:
    ends = []
    for sign in (1, -1):
        goal = np.zeros(len(limits.lb))
        goal[at] = sign
        found = milp(goal, integrality=np.ones(len(goal)), bounds=limits, constraints=rules)
        if found.status != 0:
            raise AssertionError(f"what is shown contradicts itself: {found.message}")
        ends.append(float(round(sign * found.fun)))
    return ends[0], ends[1]


def beyond(facts: Facts, shows: Sequence[Shown]) -> tuple[object, ...]:
    """What pages tell that is neither a rounded number nor a sum of these."""
    out = []
    for (edition, area, sex, start), (low, high) in facts.items():
        total = sum(
            number
            for (one, whose, age), number in shows[edition - 1].items()
            if area in (one, PARENTS[one]) and sex in (whose, "p") and start in (age, TOTAL)
        )
        if not low - 1e-6 <= total <= high + 1e-6:
            out.append((edition, area, sex, start, low, high, total))
    return tuple(out)


def main() -> None:
    asked = argparse.ArgumentParser(description=__doc__)
    asked.add_argument("--collections", type=int, default=10)
    asked.add_argument("--from", dest="first", type=int, default=0)
    asked.add_argument("--base", type=int, default=3)
    asked.add_argument("--door", action="store_true", help="read the door, not every page")
    choice = asked.parse_args()
    counts = narrow = beyond = 0
    for seed in range(choice.first, choice.first + choice.collections):
        with country(seed, terms=Terms(base=choice.base)) as (session, reader):
            facts = shown(session, EDITIONS)
            if not choice.door:
                facts = harvest(reader, EDITIONS, list(questions()))
            found = attack(session, facts, choice.base)
        counts, narrow = counts + found.counts, narrow + len(found.narrow)
        beyond += len(found.beyond)
        print(f"{seed}: {len(facts)} numbers told, {found}", flush=True)
    print(f"{choice.collections} collections: {counts} counts, {narrow} narrow, {beyond} beyond")


if __name__ == "__main__":
    main()
