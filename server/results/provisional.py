"""How far provisional figures of a collection moved before: from the first edition that had them to
the one that is read. Only editions it was built on count, so that nothing later can change it."""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace

import numpy as np

from engine import settings as named
from server.results.headlines import figures
from server.results.keys import PopulationYear
from server.results.loading import Found, assembled
from server.results.releasing import FULL, masked
from server.store import changes, masks
from server.store.changes import Held
from server.store.connect import Session
from server.store.heading import Heading
from server.store.records import Key

OF = "e0"
MEASURES = ("deaths", "person_years")
KEPT = 64  # editions of which it is remembered


@dataclass(frozen=True, slots=True)
class Past:
    """A figure that was provisional and has been handed in again since."""

    of: PopulationYear
    first: int  # the first edition that had it
    moved: float  # years of life expectancy at birth, later less earlier; nan where not known
    deaths: float  # by which share the deaths grew, 0.01 for 1 %


@dataclass(frozen=True, slots=True)
class Track:
    """All of them; `median` and `most` are of sizes, whatever the direction."""

    pasts: tuple[Past, ...] = ()

    def __bool__(self) -> bool:
        return bool(self.pasts)

    @property
    def years(self) -> tuple[str, ...]:
        return tuple(sorted({one.of.period for one in self.pasts}))

    def of(self, period: str) -> "Track":
        return Track(tuple(one for one in self.pasts if one.of.period == period))

    @property
    def median(self) -> float:
        """Of the moves of life expectancy."""
        return _median(abs(one.moved) for one in self.pasts)

    @property
    def most(self) -> Past | None:
        """Where life expectancy moved farthest."""
        known = [one for one in self.pasts if np.isfinite(one.moved)]
        return max(known, key=lambda one: abs(one.moved), default=None)

    @property
    def median_deaths(self) -> float:
        return _median(abs(one.deaths) for one in self.pasts)

    @property
    def most_deaths(self) -> Past | None:
        known = [one for one in self.pasts if np.isfinite(one.deaths)]
        return max(known, key=lambda one: abs(one.deaths), default=None)


def _median(sizes: Iterable[float]) -> float:
    known = [size for size in sizes if np.isfinite(size)]
    return float(np.median(known)) if known else float("nan")


NOTHING = Track()


def track(session: Session, heading: Heading, settings: str, shown: str) -> Track:
    """Of women and men (or whoever is held), under these settings but year by year.

    Of the first edition nothing is asked; of a later one a statement, and one more where counts are
    withheld, once as long as it is remembered.
    """
    if not heading.edition.base:
        return NOTHING
    collection = heading.collection
    known = (collection.id, collection.code, collection.made, heading.policy, heading.mask)
    which = (*known, heading.edition.digest, heading.edition.number, settings, shown)
    if which not in _KNOWN:
        while len(_KNOWN) >= KEPT:
            _KNOWN.pop(next(iter(_KNOWN)), None)
        _KNOWN[which] = _track(session, heading, settings, shown)
    return _KNOWN[which]


_KNOWN: dict[tuple[object, ...], Track] = {}


def _track(session: Session, heading: Heading, settings: str, shown: str) -> Track:
    code, number = heading.collection.code, heading.edition.number
    versions = changes.once_provisional(session, code, number, MEASURES)
    firsts = _firsts(versions, number)
    if not firsts:
        return NOTHING
    numbers = {*firsts.values(), number}
    hides = shown != FULL and heading.policy is not None
    kept = masks.find(session, code, numbers) if hides else {}

    def states(edition: int, ones: list[PopulationYear]) -> Found:
        held = {
            key: one.vector
            for key, all_ in versions.items()
            for _since, one in all_
            if one.holds_in(edition)
        }
        return assembled(masked(held, kept.get(edition)), ones)

    chain = replace(named.find(settings), years=1, borrow=False)
    pasts: list[Past] = []
    for first in sorted(set(firsts.values())):
        ones = sorted(one for one, edition in firsts.items() if edition == first)
        before, after = states(first, ones), states(number, ones)
        values = [figures(side, ones, chain, [OF])[OF] for side in (before, after)]
        for one, moved in zip(ones, values[1] - values[0], strict=True):
            pasts.append(Past(one, first, float(moved), _growth(before, after, one)))
    return Track(tuple(pasts))


def _firsts(
    versions: Mapping[Key, tuple[tuple[int, Held], ...]], number: int
) -> dict[PopulationYear, int]:
    """The first edition in which each area, sex and year was provisional, of those that are not the
    same in edition `number`."""
    found: dict[PopulationYear, int] = {}
    revised: set[PopulationYear] = set()
    for key, all_ in versions.items():
        one = PopulationYear(key.area, key.sex, key.period)
        now = next((held for _since, held in all_ if held.holds_in(number)), None)
        early = [(since, held) for since, held in all_ if held.vector.status == "provisional"]
        if early:
            since, held = early[0]
            found[one] = min(found.get(one, since), since)
            if now is not None and now.digest != held.digest:
                revised.add(one)
    kept = {one: first for one, first in found.items() if one in revised}
    sexes = {(one.area, one.period, one.sex) for one in kept}
    return {
        one: first
        for one, first in kept.items()
        if one.sex != "p" or not {(one.area, one.period, sex) for sex in "fm"} & sexes
    }


def _growth(before: Found, after: Found, one: PopulationYear) -> float:
    if one not in before or one not in after:
        return float("nan")
    old, new = (float(side[one].panel.deaths.sum()) for side in (before, after))
    return new / old - 1 if old else float("nan")
