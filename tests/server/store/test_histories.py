"""Random histories of a collection against full copies: whatever happens later, every edition reads
as it was committed. EBBLINE_HISTORIES=300 in the environment makes the long run."""

import os
import random
from collections.abc import Iterator
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from sqlalchemy.exc import IntegrityError
from sqlalchemy.orm import Session

from engine.ages import AgeGrid
from server.store import areas, breaks, causes, digests, editions, ranges, rows, schedules
from server.store.connect import transaction
from server.store.records import (
    Area,
    Basis,
    Break,
    Cause,
    Change,
    Edition,
    Key,
    Selection,
    Vector,
)
from tests.factories import NOON, stored_collection

GRIDS = [AgeGrid((0, 1, 5, 10)), AgeGrid((0, 5, 10)), AgeGrid((0, 1, 2, 3, 4, 5, 10))]
HISTORIES = {"sqlite": 40, "postgresql": 10}
Content = tuple[
    dict[Key, tuple[str, str, bytes]],
    frozenset[tuple[str, str, bool]],
    Basis,
    frozenset[Break],
    frozenset[Cause],  # without labels, which are no content
]
NOTHING: Content = ({}, frozenset(), Basis("", "", "", "", ""), frozenset(), frozenset())


class Broken(AssertionError):
    """An edition no longer reads as committed."""


class Failure(Exception):
    """The program fails in the middle of a commit."""


class History:
    """One collection, and beside it a full copy of what each edition held when it was made."""

    def __init__(self, session: Session, seed: int) -> None:
        self.session, self.code = session, f"c{seed}"
        self.random = random.Random(seed)
        self.copies: dict[int, Content] = {0: NOTHING}
        self.withdrawn: set[int] = set()
        stored_collection(session, self.code)

    def run(self, steps: int, monkeypatch: pytest.MonkeyPatch) -> None:
        for _ in range(steps):
            chance = self.random.random()
            if chance < 0.6 or len(self.copies) == 1:
                change = self.change()
                if self.random.random() < 0.2:
                    self.fail(change, monkeypatch)
                self.commit(change)
            elif chance < 0.85:
                self.turn("withdrawn", set(self.copies) - self.withdrawn - {0})
            else:
                self.turn("reinstated", self.withdrawn)
        for number in self.copies:
            self.require_unbroken(number)

    def change(self) -> Change:
        """A few schedules: new numbers, or only another status, or another grid; sometimes areas,
        the basis, keys that end, or a replacement of everything."""
        pick, base = self.random.choice, max(set(self.copies) - self.withdrawn)
        cells, listed, basis, broken, counted = self.copies[base]
        handed = {}
        for _ in range(self.random.randrange(1, 8)):
            year, cause = str(2000 + self.random.randrange(4)), pick(("", "", "x", "y"))
            key = Key(pick("ABC"), pick("fm"), year, "deaths", cause)
            grid = pick(GRIDS) if self.random.random() < 0.15 else GRIDS[0]
            numbers = np.array([float(self.random.randrange(3)) for _ in grid.starts])
            handed[key] = Vector(pick(("provisional", "final")), grid, numbers)
        if cells and self.random.random() < 0.3:
            key = pick(sorted(cells))
            status, starts, vector = cells[key]
            other = "final" if status == "provisional" else "provisional"
            handed[key] = Vector(other, AgeGrid.parse(starts), np.frombuffer(vector))
        replace, free = self.random.random() < 0.15, sorted(set(cells) - set(handed))
        ended = self.random.sample(free, min(len(free), 2)) if self.random.random() < 0.2 else ()
        known = set() if replace else {code for code, _, _ in listed}
        said = Basis("residents", "death", pick(("midyear", "person_years")), "", "")
        return Change(
            collection=self.code,
            base=base,
            cells=handed,
            areas=tuple(
                Area(code, "", pick(("", "A")) if code != "A" else "", pick((True, False)))
                for code in "ABC"
                if code not in known or self.random.random() < 0.2
            ),
            basis=basis if base and pick((True, False)) else said,
            replace=replace,
            ended=frozenset(ended),
            breaks=tuple(
                Break(area, "2002", "population", note=pick(("", "census")))
                for area in ("", "A", "B")
                if self.random.random() < 0.1
            ),
            ended_breaks=tuple(one for one in broken if self.random.random() < 0.1),
            causes=tuple(
                Cause(code, pick(("", "a name")), pick(("", "x")) if code == "y" else "", ranges)
                for code in "xyz"
                for ranges in (pick(((), ("A00",), ("A00", "B00-B99"))),)
                if code == "x" or self.random.random() < 0.3
            )
            if self.random.random() < 0.4
            else (),
            ended_causes=frozenset(
                one.code for one in counted if one.code != "x" and self.random.random() < 0.1
            ),
        )

    def commit(self, change: Change) -> None:
        edition = self.write(change)
        self.copies[edition.number] = content = self.copied(change)
        if edition.digest != digest(content):
            raise Broken(f"edition {edition.number} has another digest than its content")
        self.require_unbroken(edition.number)

    def write(self, change: Change) -> Edition:
        prepared = editions.prepare(self.session, change)
        with transaction(self.session):
            editions.require_base(self.session, self.code, change.base)
            return editions.write(self.session, prepared, by="me", note="", at=NOON)

    def copied(self, change: Change) -> Content:
        stood = NOTHING if change.replace else self.copies[change.base]
        cells = {key: cell for key, cell in stood[0].items() if key not in change.ended}
        for key, cell in change.cells.items():
            cells[key] = (cell.status, cell.grid.code, cell.values.tobytes())
        tree = {area[0]: area for area in stood[1]}
        tree |= {area.code: (area.code, area.parent, area.delivered) for area in change.areas}
        places = {(one.area, one.period, one.kind, one.cause): one for one in stood[3]}
        for one in change.ended_breaks:
            places.pop((one.area, one.period, one.kind, one.cause), None)
        for one in change.breaks:
            places[one.area, one.period, one.kind, one.cause] = one
        listed = {one.code: one for one in stood[4] if one.code not in change.ended_causes} | {
            one.code: replace(one, label="") for one in change.causes
        }
        return (
            cells,
            frozenset(tree.values()),
            change.basis,
            frozenset(places.values()),
            frozenset(listed.values()),
        )

    def fail(self, change: Change, monkeypatch: pytest.MonkeyPatch) -> None:
        def failing(*_arguments: object) -> Iterator[Any]:
            raise Failure
            yield

        with monkeypatch.context() as patch:
            patch.setattr(
                rows,
                self.random.choice(("schedules", "areas", "basis", "breaks", "causes")),
                failing,
            )
            with pytest.raises(Failure):
                self.write(change)

    def turn(self, what: Any, among: set[int]) -> None:
        if among:
            number = self.random.choice(sorted(among))
            with transaction(self.session):
                editions.record_event(
                    self.session, self.code, number, what, by="me", note="", at=NOON
                )
            self.withdrawn ^= {number}

    def require_unbroken(self, number: int) -> None:
        if self.read(number) != self.copies[number]:
            raise Broken(f"edition {number} of {len(self.copies) - 1} reads otherwise than it was")

    def read(self, number: int) -> Content:
        if not number:
            return NOTHING
        everything = Selection(cause=None)
        found = schedules.load(self.session, self.code, number, everything)
        edition = editions.find(self.session, self.code, number)
        assert edition is not None
        assert edition.withdrawn == (number in self.withdrawn)
        tree = areas.listing(self.session, self.code, number)
        return (
            {
                key: (cell.status, cell.grid.code, cell.values.tobytes())
                for key, cell in found.items()
            },
            frozenset((area.code, area.parent, area.delivered) for area in tree),
            edition.basis,
            frozenset(breaks.listing(self.session, self.code, number)),
            frozenset(
                replace(one, label="") for one in causes.listing(self.session, self.code, number)
            ),
        )


def digest(content: Content) -> str:
    cells, tree, basis, broken, counted = content
    return digests.of_edition(
        [
            digests.of_basis(basis),
            *map(digests.of_break, broken),
            *map(digests.of_cause, counted),
            *(digests.of_area(Area(code, "", *rest)) for code, *rest in tree),
            *(
                digests.of_schedule(
                    key, Vector(status, AgeGrid.parse(starts), np.frombuffer(vector))
                )
                for key, (status, starts, vector) in cells.items()
            ),
        ]
    )


def test_every_edition_reads_as_committed(
    session: Session, monkeypatch: pytest.MonkeyPatch
) -> None:
    usual = HISTORIES[session.get_bind().dialect.name]
    for seed in range(int(os.environ.get("EBBLINE_HISTORIES", usual))):
        History(session, seed).run(15, monkeypatch)


def test_a_difference_from_the_standing_edition_breaks_histories(
    session: Session, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The obvious choice, taken on purpose: the same histories must notice it."""
    right = ranges.difference

    def naive(*where: Any, base: int, against: int, **rest: Any) -> ranges.Difference:
        return right(*where, base=base, against=base, **rest)

    monkeypatch.setattr(ranges, "difference", naive)
    broken = 0
    for seed in range(16):
        try:
            History(session, seed).run(15, monkeypatch)
        except (Broken, IntegrityError):
            broken += 1
    assert broken >= 4
