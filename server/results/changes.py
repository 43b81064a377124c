"""What differs between two editions of a collection: counts, statuses, and every headline that
moves. A revision has no interval: the same deaths, counted again."""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import ClassVar, Self
from urllib.parse import urlencode

import numpy as np

from engine.ages import Array
from server.results.headlines import Headline, headlines
from server.results.holdings import NotInEdition
from server.results.keys import (
    DEFAULT_SETTINGS,
    BadValue,
    Items,
    Keys,
)
from server.results.releasing import FULL, masked
from server.sentences.text import _
from server.store import areas, breaks, causes, changes, editions, masks, schedules
from server.store.connect import Session
from server.store.errors import Missing
from server.store.heading import Heading
from server.store.records import Area, Break, Cause, Edition, Key, Vector

Cells = Mapping[Key, Vector]


@dataclass(frozen=True, slots=True)
class ChangesQuestion:
    """What did this edition change since another? `since` 0: the one it was built on."""

    view: ClassVar[str] = "changes"

    since: int = 0
    figures: str = "released"
    settings: str = DEFAULT_SETTINGS

    @classmethod
    def parse(cls, items: Items) -> Self:
        keys = Keys(items, once=("since", "figures", "settings"))
        return cls(since(keys), keys.figures(), keys.settings())

    def canonical(self) -> str:
        return urlencode(
            [("since", self.since), ("figures", self.figures), ("settings", self.settings)]
        )


def since(keys: Keys) -> int:
    """The number of an earlier edition; 0 where the address gives none. BadValue."""
    text = keys.one("since")
    if not text:
        return 0
    if not (text.isascii() and text.isdecimal() and 0 < len(text) < 10 and int(text)):
        raise BadValue(
            _(
                "The key “since” has the value “{text}”; it takes the number of an edition, for"
                " example since=1.",
                text=text,
            )
        )
    return int(text)


def earlier(session: Session, heading: Heading, number: int) -> Edition:
    """The edition to set beside the heading's; Missing, with those there are, or BadValue where it
    is the same."""
    code = heading.collection.code
    if number == heading.edition.number:
        raise BadValue(
            _(
                "The address sets edition {number} against itself. Name another after “since”.",
                number=number,
            )
        )
    found = editions.find(session, code, number)
    if found is None:
        raise Missing("edition", number, [one.number for one in editions.listing(session, code)])
    return found


def default_since(session: Session, heading: Heading) -> int:
    """The edition this one was built on. NotInEdition where it is the first."""
    if not heading.edition.base:
        raise NotInEdition(
            _(
                "Edition {number} was built on no earlier one, so there is nothing that it"
                " changed. Name another edition after “since”.",
                number=heading.edition.number,
            )
        )
    return heading.edition.base


@dataclass(frozen=True, slots=True)
class Altered:
    """One schedule that is not the same in both; None: not held."""

    key: Key
    then: Vector | None
    now: Vector | None

    @property
    def kind(self) -> str:
        """added, dropped, groups (other age groups), numbers, or marks (the numbers are the same,
        another status or mark stands beside them)."""
        if self.then is None:
            return "added"
        if self.now is None:
            return "dropped"
        if self.then.grid != self.now.grid:
            return "groups"
        same = np.array_equal(self.then.values, self.now.values, equal_nan=True)
        return "marks" if same else "numbers"

    @property
    def ages(self) -> int:
        """Age groups whose number is another; all of them where groups are new or gone."""
        then, now = self.then, self.now
        if then is None or now is None or then.grid != now.grid:
            held = now or then
            return len(held.grid) if held else 0
        gone = np.isnan(then.values) & np.isnan(now.values)
        return int(np.sum((then.values != now.values) & ~gone))

    @property
    def before(self) -> float:
        return _total(self.then)

    @property
    def after(self) -> float:
        return _total(self.now)

    @property
    def restated(self) -> bool:
        """Whether its status is another."""
        return bool(self.then and self.now and self.then.status != self.now.status)


def _total(vector: Vector | None) -> float:
    return float("nan") if vector is None else float(vector.values.sum())


@dataclass(frozen=True, slots=True)
class Yearly:
    """The deaths and person-years of a year over the whole collection, before and after."""

    period: str
    deaths: tuple[float, float]
    person_years: tuple[float, float]


@dataclass(frozen=True, slots=True)
class Changes:
    """All that edition `heading` changed since `then`."""

    heading: Heading
    question: ChangesQuestion
    then: Edition
    names: dict[str, str]  # of areas of either edition, by code
    altered: tuple[Altered, ...]  # of all causes of death
    moved: tuple[Headline, ...]  # largest first within an indicator
    periods: tuple[frozenset[str], frozenset[str]]  # held then, held now
    others: tuple[int, ...]  # numbers of all editions, the newest first
    areas: tuple[tuple[Area | None, Area | None], ...]  # then, now: added, gone or placed elsewhere
    basis: tuple[tuple[str, str, str], ...]  # part of the basis, then, now
    breaks: tuple[tuple[Break | None, Break | None], ...]  # then, now
    by_cause: tuple[Altered, ...] = ()
    causes: tuple[Cause, ...] = ()  # of the lists of both, where one has any

    def name(self, area: str) -> str:
        return self.names.get(area, area)

    @property
    def numbers(self) -> tuple[Altered, ...]:
        """Those whose numbers or age groups are others, or that are new or gone."""
        return tuple(one for one in self.altered if one.kind != "marks")

    @property
    def rebased(self) -> tuple[str, ...]:
        """The years whose population is another under the same deaths, where nothing but the
        population changed: a rebase."""
        numbers = self.numbers
        if not numbers or any(one.key.measure != "person_years" for one in numbers):
            return ()
        if any(one.kind in ("added", "dropped") for one in numbers):
            return ()
        return tuple(sorted({one.key.period for one in numbers}))

    @property
    def statuses(self) -> tuple[Altered, ...]:
        return tuple(one for one in self.altered if one.restated)

    def moves(self, key: str) -> tuple[Headline, ...]:
        return tuple(one for one in self.moved if one.key == key)


def found_changes(session: Session, heading: Heading, question: ChangesQuestion) -> Changes:
    """A dozen statements at most, however much was changed; one engine call a grid and indicator.
    Missing, BadValue, NotInEdition."""
    code, now = heading.collection.code, heading.edition.number
    then = earlier(session, heading, question.since or default_since(session, heading))
    differing = [
        Altered(key, *pair) for key, pair in _differing(session, code, then.number, now, question)
    ]
    altered = tuple(one for one in differing if not one.key.cause)
    by_cause = tuple(one for one in differing if one.key.cause)
    trees = (areas.listing(session, code, then.number), areas.listing(session, code, now))
    moved = headlines(
        session,
        code,
        (then.number, now),
        trees,
        [one.key for one in altered],
        question.settings,
        question.figures,
    )
    return Changes(
        heading=heading,
        question=question,
        then=then,
        names={area.code: area.name for tree in trees for area in tree},
        altered=altered,
        moved=moved,
        periods=(_periods(session, code, then.number), _periods(session, code, now)),
        others=tuple(one.number for one in editions.listing(session, code)),
        areas=_areas(*trees),
        basis=_basis(then, heading.edition),
        breaks=_breaks(session, code, then.number, now),
        by_cause=by_cause,
        causes=_causes(session, code, then.number, now) if by_cause else (),
    )


def _differing(
    session: Session, code: str, then: int, now: int, question: ChangesQuestion
) -> Iterable[tuple[Key, changes.Pair]]:
    """The schedules that differ, as they may be shown: of one whose withheld counts alone moved
    nothing is told."""
    pairs = changes.differing(session, code, then, now).items()
    protected = masks.find(session, code, (then, now)) if question.figures != FULL else {}
    for key, pair in pairs:
        old, new = (
            vector if vector is None else masked({key: vector}, protected.get(number)).get(key)
            for number, vector in zip((then, now), pair, strict=True)
        )
        if not protected or _unlike(old, new):
            yield key, (old, new)


def _unlike(then: Vector | None, now: Vector | None) -> bool:
    if then is None or now is None:
        return then is not now
    return (then.status, then.grid, then.estimated) != (now.status, now.grid, now.estimated) or (
        not np.array_equal(then.values, now.values, equal_nan=True)
    )


def _causes(session: Session, code: str, then: int, now: int) -> tuple[Cause, ...]:
    """Those of the newer list in its order, then those that it lost."""
    newer, older = (causes.listing(session, code, number) for number in (now, then))
    kept = {cause.code for cause in newer}
    return (*newer, *(cause for cause in older if cause.code not in kept))


def _periods(session: Session, code: str, number: int) -> frozenset[str]:
    return frozenset(schedules.contents(session, code, number).periods)


def _areas(
    then: tuple[Area, ...], now: tuple[Area, ...]
) -> tuple[tuple[Area | None, Area | None], ...]:
    """Areas that are new, gone, or placed elsewhere, by code."""
    old, new = ({area.code: area for area in tree} for tree in (then, now))

    def placed(area: Area | None) -> tuple[str, bool] | None:
        return (area.parent, area.delivered) if area else None

    codes = sorted(old.keys() | new.keys())
    pairs = ((old.get(code), new.get(code)) for code in codes)
    return tuple(pair for pair in pairs if placed(pair[0]) != placed(pair[1]))


def _basis(then: Edition, now: Edition) -> tuple[tuple[str, str, str], ...]:
    sides = ((part, *(getattr(one.basis, part) for one in (then, now))) for part in BASIS)
    return tuple(side for side in sides if side[1] != side[2])


BASIS = ("people", "dated_by", "population", "population_date", "source", "vintage")


def _breaks(
    session: Session, code: str, then: int, now: int
) -> tuple[tuple[Break | None, Break | None], ...]:
    sides = []
    for number in (then, now):
        held = breaks.listing(session, code, number)
        sides.append({(one.area, one.period, one.kind, one.cause): one for one in held})
    keys = sorted(sides[0].keys() | sides[1].keys())
    pairs = ((sides[0].get(key), sides[1].get(key)) for key in keys)
    return tuple(pair for pair in pairs if pair[0] != pair[1])


def yearly(
    before: Cells, after: Cells, tree: Iterable[Area], old_tree: Iterable[Area]
) -> tuple[Yearly, ...]:
    """Deaths and person-years of every year of either, over the whole collection; nan where a year
    has none. Persons are counted once: an area in its whole, sexes in persons."""
    periods = sorted({key.period for cells in (before, after) for key in cells})
    sides = (_Sums(before, tuple(old_tree)), _Sums(after, tuple(tree)))

    def pair(measure: str, period: str) -> tuple[float, float]:
        old, new = (side.total(measure, period) for side in sides)
        return old, new

    return tuple(
        Yearly(period, pair("deaths", period), pair("person_years", period)) for period in periods
    )


def _summed(values: Array) -> float:
    """Without the gaps, which few have."""
    found = float(np.add.reduce(values))
    return found if found == found else float(np.nansum(values))


@dataclass(frozen=True, slots=True)
class _Sums:
    cells: Cells
    tree: tuple[Area, ...]

    def total(self, measure: str, period: str) -> float:
        tops = [self._of(area.code, measure, period) for area in self.tree if not area.parent]
        known = [one for one in tops if np.isfinite(one)]
        return sum(known) if known else float("nan")

    def _of(self, area: str, measure: str, period: str) -> float:
        """Persons, or women and men; of an area without counts those of its parts."""
        persons = self.cells.get(Key(area, "p", period, measure))
        sexes = (self.cells.get(Key(area, sex, period, measure)) for sex in ("f", "m"))
        held = [persons] if persons else [one for one in sexes if one]
        if held:
            return sum(_summed(one.values) for one in held)
        parts = [self._of(one.code, measure, period) for one in self.tree if one.parent == area]
        known = [one for one in parts if np.isfinite(one)]
        return sum(known) if known else float("nan")
