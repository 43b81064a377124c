"""A figure between two editions: each kind of counts, the make-up of the area and the settings as
they were or as they are."""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from typing import Protocol, Self

import numpy as np

from engine import indicators
from engine import settings as named
from engine.settings import span
from server.results import composition
from server.results.composition import Composition, parts_of
from server.results.headlines import figures
from server.results.keys import PopulationYear
from server.results.loading import Beside, Cells, assembled, needed
from server.results.releasing import released
from server.results.shares import State, states
from server.store import changes, uploads
from server.store.connect import Session
from server.store.records import Area, Key, Selection, Vector

# which counts each part holds; `reading` takes over those of a file that is the same to the byte
COUNTS = {
    "deaths": ("deaths", "counted_deaths"),
    "population": ("person_years",),
    "births": ("births", "stillbirths", "neonatal_deaths"),
}
ROLES = {
    "deaths": ("deaths", "counts"),
    "population": ("population", "counts"),
    "births": ("births",),
}
PARTS = (*COUNTS, "reading", "areas", "settings")


class Question(Protocol):
    """Which figure, and the settings on both sides."""

    @property
    def at(self) -> PopulationYear: ...
    @property
    def of(self) -> str: ...
    @property
    def figures(self) -> str: ...
    @property
    def settings(self) -> str: ...
    @property
    def settings_then(self) -> str: ...


@dataclass(frozen=True, slots=True)
class Sides:
    """The schedules of both editions that the figure rests on, and how to mix them."""

    question: Question
    numbers: tuple[int, int]
    cells: tuple[Cells, Cells]
    composition: Composition
    besides: tuple[Beside, Beside]

    @classmethod
    def loaded(
        cls,
        session: Session,
        code: str,
        numbers: tuple[int, int],
        trees: tuple[tuple[Area, ...], tuple[Area, ...]],
        question: Question,
    ) -> Self:
        of = indicators.find(question.of)
        chains = [named.find(one) for one in (question.settings_then, question.settings)]
        besides = tuple(
            Beside.of(chain, tree, of) for chain, tree in zip(chains, trees, strict=True)
        )
        then, now = (parts_of(tree, question.at.area) for tree in trees)
        made_of = Composition(then, now, composition.since(session, code, *numbers))
        periods = {year for chain in chains for year in span(question.at.period, chain.years)}
        chosen = _joined(
            [needed([question.at], beside) for beside in besides], made_of.codes(periods)
        )
        before, after = (released(session, code, one, chosen, question.figures) for one in numbers)
        return cls(question, numbers, (before, after), made_of, (besides[0], besides[1]))

    @property
    def periods(self) -> tuple[str, ...]:
        return tuple(sorted({key.period for cells in self.cells for key in cells}))

    @property
    def recomposed(self) -> bool:
        """Whether the area is made up of other codes, or is part of another where that counts."""
        return self.composition.differs(self.periods) or self._whole(0) != self._whole(1)

    def _whole(self, side: int) -> str:
        """The area whose counts stand beside, empty where none do."""
        chain = named.find((self.question.settings_then, self.question.settings)[side])
        asks = chain.borrow or indicators.find(self.question.of).needs.whole
        return self.besides[side].parents.get(self.question.at.area, "") if asks else ""

    def parts(self, part_of: dict[str, str]) -> tuple[str, ...]:
        """What differs, in the order of PARTS."""
        found = set(part_of.values())
        found |= {"areas"} if self.recomposed else set()
        found |= {"settings"} if self.question.settings != self.question.settings_then else set()
        return tuple(part for part in PARTS if part in found)

    def differing(self, kind: str) -> tuple[Key, ...]:
        """Schedules of a kind that are not the same in both, made up as they are now."""
        then, now = (
            self._of(kind, later=False, as_now=True),
            self._of(kind, later=True, as_now=True),
        )
        keys = sorted(key for key in then.keys() | now.keys() if self._counts(key))
        return tuple(key for key in keys if not _same(then.get(key), now.get(key)))

    def _counts(self, key: Key) -> bool:
        """Whether the figure rests on a schedule itself, not only as a part of one that it does."""
        at, sides = self.question.at, self.besides
        standards = {one.standard for one in sides if one.standard}
        areas = {at.area, self._whole(0), self._whole(1), *(one.area for one in standards)}
        sexes = {at.sex, *(one.sex for one in standards)}
        return key.area in areas and key.sex in (sexes | ({"f", "m"} if "p" in sexes else set()))

    def values(self, parts: tuple[str, ...], part_of: dict[str, str]) -> dict[State, float]:
        """The figure in every state between then and now."""
        question, found = self.question, {}
        for state in states(parts):
            cells: dict[Key, Vector] = {}
            for kind in COUNTS:
                later = part_of.get(kind, "") in state
                cells |= self._of(kind, later=later, as_now="areas" in state)
            key = question.settings if "settings" in state else question.settings_then
            beside = self.besides["areas" in state]
            beside = replace(beside, years=named.find(key).years)
            loaded = assembled(cells, [question.at], beside)
            value = figures(loaded, [question.at], named.find(key), [question.of])
            found[state] = float(value[question.of][0])
        return found

    def _of(self, kind: str, *, later: bool, as_now: bool) -> Cells:
        """Schedules of a kind of one edition, the area made up as in one of the two."""
        cells = {
            key: cell for key, cell in self.cells[later].items() if key.measure in COUNTS[kind]
        }
        if later == as_now or not self.composition.differs(self.periods):
            return cells
        area = self.question.at.area
        beside = {key: cell for key, cell in cells.items() if key.area != area}
        turned = self.composition.later_as_then if later else self.composition.earlier_as_now
        return beside | turned(cells, area)


def _joined(chosen: Iterable[Selection], codes: Iterable[str]) -> Selection:
    """The schedules of all of these, and of further areas."""
    every = list(chosen)

    def all_of(part: str) -> tuple[str, ...]:
        return tuple(sorted({code for one in every for code in getattr(one, part) or ()}))

    return Selection(
        areas=tuple(sorted({*all_of("areas"), *codes})),
        sexes=all_of("sexes"),
        periods=all_of("periods"),
        measures=all_of("measures"),
    )


def _same(then: Vector | None, now: Vector | None) -> bool:
    if then is None or now is None:
        return then is now
    return then.grid == now.grid and np.array_equal(then.values, now.values, equal_nan=True)


def part_of(session: Session, collection: str, sides: Sides) -> dict[str, str]:
    """By kind of counts that differ, the part they belong to: their own, or `reading` where every
    one of them comes from a file that is the same to the byte."""
    needs = indicators.find(sides.question.of).needs
    kinds = [kind for kind in COUNTS if kind != "births" or needs.births]
    differing = {kind: keys for kind in kinds if (keys := sides.differing(kind))}
    if not differing:
        return {}
    every = [key for several in differing.values() for key in several]
    made = changes.versions(
        session,
        collection,
        max(sides.numbers),
        Selection(
            areas=tuple(sorted({key.area for key in every} | {*sides.composition.now})),
            sexes=("f", "m", "p"),
            periods=tuple(sorted({key.period for key in every})),
            measures=tuple(sorted({key.measure for key in every})),
        ),
    )
    digests = uploads.digests_of_editions(session, collection)
    return {
        kind: "reading"
        if not sides.recomposed and _read_otherwise(made, digests, kind, sides)
        else kind
        for kind in differing
    }


def _read_otherwise(
    made: Mapping[Key, tuple[changes.Held, ...]],
    digests: Mapping[int, Mapping[str, str]],
    kind: str,
    sides: Sides,
) -> bool:
    """Whether all that differs of a kind was read from the same bytes both times."""
    leaves = set(sides.composition.now)
    found: list[bool] = []
    for key, versions in made.items():
        summed = key.sex == "p" and {key._replace(sex=sex) for sex in ("f", "m")} <= made.keys()
        if key.measure not in COUNTS[kind] or key.area not in leaves or summed:
            continue
        then, now = (_origin(versions, number) for number in sides.numbers)
        if then != now:
            sides_of = (_bytes(digests, origin, kind) for origin in (then, now))
            found.append(len(set(sides_of) - {""}) == 1 and then != 0 != now)
    return bool(found) and all(found)


def _origin(versions: tuple[changes.Held, ...], number: int) -> int:
    """The edition whose upload brought what holds in edition `number`; 0: nothing holds."""
    held = next((one for one in versions if one.holds_in(number)), None)
    if held is None:
        return 0
    return min(one.first for one in versions if one.digest == held.digest)


def _bytes(digests: Mapping[int, Mapping[str, str]], edition: int, kind: str) -> str:
    files = digests.get(edition, {})
    return next((files[role] for role in ROLES[kind] if role in files), "")
