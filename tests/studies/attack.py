"""The attack on withheld counts: everything a reader can fetch of two editions, solved for whole
numbers of deaths.

    python -m tests.studies.attack --collections 20

For each drawn country the twins of every population-year and curve of both editions are read; every
number in them that is a count, or a rate that with the people gives one, becomes a bound; sums over
ages, sexes and areas, and that a number did not change between editions, are taken as known. Then
the least and the most that each withheld count can be is searched for (whole-number programmes).
"""

import argparse
import datetime as dt
import math
import tempfile
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
from scipy.optimize import Bounds, LinearConstraint, milp
from scipy.sparse import csr_array, vstack
from starlette.testclient import TestClient

from engine.ages import AgeGrid
from engine.panel import Panel
from server.accounts.viewer import LOCAL
from server.actions.set_policy import set_policy
from server.app import create_app
from server.config import Config
from server.disclosure.blocks import SEXES, TOTAL, block
from server.disclosure.equations import equations
from server.results.questions import (
    CurvesQuestion,
    PopulationYear,
    PopulationYearQuestion,
    Question,
    address,
)
from server.results.releasing import released
from server.store import areas, masks, schedules
from server.store.connect import Session, make_engine, sessions
from server.store.migrating import migrate
from server.store.records import Key, Selection, Terms
from tests.factories import edition, gompertz_panel
from tests.server.web.site import browser

GRID = AgeGrid((0, 1, 5, 15, 25, 45, 65, 75, 85, 95))
YEAR, CODE = "2019", "isle"
TERMS = Terms(threshold=5)
PARENTS = {"north": "whole", "south": "whole", "east": "whole", "cape": "whole"}
PEOPLE = {"north": 400_000.0, "south": 150_000.0, "east": 40_000.0, "cape": 8_000.0}
NOW = dt.datetime(2026, 12, 1, 9, tzinfo=dt.UTC)
Cell = tuple[int, str, str, int]  # edition, area, sex, start of the group or TOTAL
Facts = dict[Cell, tuple[float, float]]  # least and most that a twin leaves open


@dataclass(frozen=True, slots=True)
class Found:
    """What the attack makes of the withheld counts of all editions."""

    withheld: int
    fixed: tuple[Cell, ...]  # there is one solution only
    narrowed: tuple[Cell, ...]  # small counts that cannot be any other small count

    @property
    def held(self) -> bool:
        return not self.fixed and not self.narrowed


# ---- a country, drawn ----------------------------------------------------------------------------


def panels(seed: int) -> dict[str, Panel]:
    return {
        f"{area}.{sex}.{YEAR}": _panel(people, sex, 100 * seed + 10 * at + (sex == "m"))
        for at, (area, people) in enumerate(PEOPLE.items())
        for sex in "fm"
    }


def _panel(people: float, sex: str, seed: int) -> Panel:
    drawn = gompertz_panel(GRID, people=people, sex=sex, seed=seed, level=2.2e-5, accidents=2e-4)
    return replace(drawn, exposure=np.round(drawn.exposure))


def later(given: dict[str, Panel], seed: int) -> dict[str, Panel]:
    """A revision: deaths reported late, in all areas or in one."""
    rng = np.random.default_rng(seed)
    chosen = list(PEOPLE) if seed % 2 else [list(PEOPLE)[seed // 2 % len(PEOPLE)]]
    return {
        name: replace(panel, deaths=panel.deaths + rng.poisson(0.5, len(GRID)))
        for name, panel in given.items()
        if name.split(".")[0] in chosen
    }


def deliver(
    session: Session, seed: int, *, first: dict[str, Panel] | None = None, terms: Terms = TERMS
) -> None:
    """Two editions under a policy."""
    given = first or panels(seed)
    edition(session, given, code=CODE, parents=PARENTS)
    set_policy(session, collection=CODE, terms=terms, note="Small counts.", by=LOCAL, now=NOW)
    edition(session, later(given, seed), code=CODE, parents=PARENTS)


@contextmanager
def country(seed: int, **more: Any) -> Iterator[tuple[Session, TestClient]]:
    """A database of its own, and a reader of its pages."""
    with tempfile.TemporaryDirectory() as folder:
        config = Config(data=Path(folder))
        migrate(config.url)
        engine = make_engine(config.url)
        with sessions(engine)() as session:
            deliver(session, seed, **more)
            with browser(create_app(config)) as reader:
                yield session, reader
        engine.dispose()


# ---- what a reader can fetch ---------------------------------------------------------------------


def questions(figures: str = "released") -> Iterator[Question]:
    for area in ("whole", *PARENTS):
        for sex in SEXES:
            one = PopulationYear(area, sex, YEAR)
            for settings in ("almanac-1", "almanac-2"):
                yield PopulationYearQuestion(one, figures, settings)
            yield CurvesQuestion(one, figures)


def harvest(reader: TestClient, editions: Iterable[int], asked: Iterable[Question]) -> Facts:
    """Every count that the twins tell, or bound."""
    facts: Facts = {}
    for number in editions:
        for question in asked:
            answer = reader.get(address(CODE, number, question, twin="json"))
            if answer.status_code != 200:
                continue
            one = getattr(question, "of")  # noqa: B009  (a Question in general has none)
            for start, low, high in _told(answer.json()["figures"]):
                cell = (number, one.area, one.sex, start)
                was = facts.get(cell, (0.0, math.inf))
                facts[cell] = (max(was[0], low), min(was[1], high))
    return facts


def _told(figures: dict[str, Any]) -> Iterator[tuple[int, float, float]]:
    starts = dict(zip(GRID.labels, GRID.starts, strict=True))
    people: dict[int, float] = {}
    for name, table in figures.items():
        if name == "single":  # single years worked out from groups are no counts
            continue
        for row in table["rows"]:
            start = starts.get(str(row.get("age")))
            if start is None:
                continue
            years = row.get("person_years")
            people |= {start: years} if isinstance(years, float) else {}
            for key in ("deaths", "there"):
                if (told := _count(row.get(key))) is not None:
                    yield start, told, told
            if _count(row.get("deaths")) is not None:
                continue  # its rate says no more, and may be that of joined ages, or borrowed
            for key in ("mx", "counted"):
                rate, years = row.get(key), people.get(start)
                if isinstance(rate, float) and years:
                    yield (start, *_deaths(rate, years, 1000))
    for table in figures.values():
        for row in table["rows"]:
            if row.get("indicator") == "cdr" and isinstance(row.get("value"), float):
                yield (TOTAL, *_deaths(row["value"], sum(people.values()), 100_000))


def _deaths(rate: float, years: float, per: float) -> tuple[float, float]:
    """The least and the most deaths behind a rate: one with few decimals was rounded."""
    decimals = len(repr(rate).partition(".")[2])
    off = 0.5 * 10.0**-decimals if decimals <= 4 else 1e-9
    return (rate - off) * years / per - 1e-6, (rate + off) * years / per + 1e-6


def _count(cell: Any) -> float | None:
    if isinstance(cell, int | float):
        return float(cell)
    return 0.0 if isinstance(cell, dict) and cell.get("missing") == "nil" else None


def shown(session: Session, editions: Iterable[int], figures: str = "released") -> Facts:
    """What the one door through which counts reach any page lets through: all that pages can tell
    of counts, without the pages."""
    facts: Facts = {}
    for number in editions:
        cells = released(session, CODE, number, Selection(measures=("deaths",)), figures)
        protected = masks.find(session, CODE, (number,))[number].kept.mask
        gone = protected if figures == "released" else {}
        for key, vector in cells.items():
            for start, value in zip(vector.grid.starts, vector.values.tolist(), strict=True):
                if start not in vector.withheld:
                    facts[(number, key.area, key.sex, start)] = (value, value)
            if key not in gone or TOTAL not in gone[key].ages:
                total = round(float(vector.values.sum()))
                facts[(number, key.area, key.sex, TOTAL)] = (total, total)
    return facts


# ---- solving for what is not told ----------------------------------------------------------------


def attack(session: Session, facts: Facts, editions: tuple[int, ...] = (1, 2)) -> Found:
    """The truth is used to say which numbers are equal in two editions, and to judge the result."""
    names: dict[tuple[object, ...], int] = {}
    rows, low, high, hidden = [], [], [], {}
    for number in editions:
        tree = areas.listing(session, CODE, number)
        cells = schedules.load(session, CODE, number, Selection(measures=("deaths",)))
        gone = masks.find(session, CODE, (number,))[number].kept.mask
        of = block(tree, YEAR, "deaths", cells)
        places = []
        for slot, place in enumerate(of.area.tolist()):
            area, start = tree[place].code, int(of.start[slot])
            for sex, code in enumerate(SEXES):
                value = float(of.values[slot, sex])
                at = names.setdefault((area, start, sex, value), len(names))
                if at == len(low):
                    low.append(0.0)
                    high.append(np.inf)
                places.append(at)
                cell = (number, area, code, start)
                key = Key(area, code, YEAR, "deaths")
                secret = key in gone and start in gone[key].ages
                # a sum that is withheld is not what a rate of stand-ins adds up to
                least, most = (
                    (0.0, np.inf) if secret and start == TOTAL else facts.get(cell, (0.0, np.inf))
                )
                low[at], high[at] = max(low[at], least), min(high[at], most)
                if secret:
                    hidden[cell] = (at, value)
        matrix = equations(of).matrix
        rows.append((matrix, places))
    joint = vstack([_placed(matrix, at, len(names)) for matrix, at in rows])
    bounds = Bounds(np.ceil(np.array(low) - 1e-9), np.floor(np.array(high) + 1e-9))
    ends = {cell: _ends(joint, bounds, at) for cell, (at, _value) in hidden.items()}
    fixed = tuple(cell for cell, (least, most) in ends.items() if least == most)
    narrowed = tuple(
        cell
        for cell, (least, most) in ends.items()
        if 0 < hidden[cell][1] < TERMS.threshold and (least > 1 or most < TERMS.threshold - 1)
    )
    return Found(len(hidden), fixed, narrowed)


def _placed(matrix: csr_array, places: list[int], width: int) -> csr_array:
    columns = np.array(places)[matrix.indices]
    return csr_array((matrix.data, columns, matrix.indptr), (matrix.shape[0], width))


def _ends(joint: csr_array, bounds: Bounds, at: int) -> tuple[float, float]:
    ends = []
    for sign in (1, -1):
        goal = np.zeros(joint.shape[1])
        goal[at] = sign
        found = milp(
            goal,
            integrality=np.ones(len(goal)),
            bounds=bounds,
            constraints=LinearConstraint(joint, 0, 0),
        )
        if found.status == 2:
            raise AssertionError("the twins contradict one another: no whole numbers fit them")
        ends.append(float(round(sign * found.fun)) if found.status == 0 else np.inf)
    return ends[0], ends[1]


def main() -> None:
    asked = argparse.ArgumentParser(description=__doc__)
    asked.add_argument("--collections", type=int, default=20)
    asked.add_argument("--from", dest="first", type=int, default=0)
    asked.add_argument("--door", action="store_true", help="read the door, not every page")
    choice = asked.parse_args()
    withheld = fixed = narrowed = 0
    for seed in range(choice.first, choice.first + choice.collections):
        with country(seed) as (session, reader):
            facts = shown(session, (1, 2))
            if not choice.door:
                facts = harvest(reader, (1, 2), list(questions()))
            found = attack(session, facts)
        withheld, fixed = withheld + found.withheld, fixed + len(found.fixed)
        narrowed += len(found.narrowed)
        print(f"{seed}: {found.withheld} withheld, fixed {found.fixed}, narrowed {found.narrowed}")
    print(
        f"{choice.collections} collections: {withheld} withheld, {fixed} fixed, {narrowed} narrowed"
    )


if __name__ == "__main__":
    main()
