"""The usual figures of many areas, sexes and years in two editions, and those that moved."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from engine import indicators
from engine import settings as named
from engine.ages import AgeGrid, Array
from engine.indicators import Indicator
from engine.panel import Panel
from engine.settings import Settings
from server.results.estimating import USUAL
from server.results.keys import PopulationYear
from server.results.loading import Beside, Found, Loaded, load
from server.results.protecting import withheld
from server.store.connect import Session
from server.store.records import Area, Key

Trees = tuple[tuple[Area, ...], tuple[Area, ...]]  # of the earlier and of the later edition


@dataclass(frozen=True, slots=True)
class Headline:
    """A figure that is not the same in both editions; nan where one of them cannot give it."""

    of: PopulationYear
    key: str  # of the indicator
    before: float
    after: float

    @property
    def move(self) -> float:
        return self.after - self.before


def headlines(
    session: Session,
    collection: str,
    numbers: tuple[int, int],
    trees: Trees,
    changed: Iterable[Key],
    settings: str,
    shown: str,
) -> tuple[Headline, ...]:
    """The usual figures that another count of these schedules moves, largest first within an
    indicator, those one edition lacks before all. `shown`:
    as released, or in full. Two statements."""
    chain = named.find(settings)
    ones = sorted(reached(changed, trees, chain))
    values = []
    for number, tree in zip(numbers, trees, strict=True):
        beside = Beside.of(chain, tree)
        loaded = load(session, collection, number, ones, beside, figures=shown)
        values.append(figures(loaded, ones, chain))
    found = []
    for key in USUAL:
        before, after = (side[key] for side in values)
        moved = ~((before == after) | (np.isnan(before) & np.isnan(after)))
        rows = [Headline(ones[at], key, before[at], after[at]) for at in np.flatnonzero(moved)]
        found += sorted(rows, key=lambda one: (-_size(one.move), one.of))
    return tuple(found)


def _size(move: float) -> float:
    return abs(move) if np.isfinite(move) else np.inf


def reached(changed: Iterable[Key], trees: Trees, settings: Settings) -> set[PopulationYear]:
    """Every population-year whose figures these schedules enter: their own; persons, whose first
    year is that of women and men; the years that are pooled with them; parts of the area where they
    borrow its rate."""
    parts: dict[str, set[str]] = {}
    for tree in trees:
        for area in tree:
            parts.setdefault(area.parent, set()).add(area.code)
    found = set()
    for key in changed:
        places = {key.area} | (parts.get(key.area, set()) if settings.borrow else set())
        for code in places:
            for sex in {key.sex, "p"}:
                for later in range(settings.years):
                    year = f"{int(key.period) + later:04}"
                    found.add(PopulationYear(code, sex, year))
    return found


def figures(
    loaded: Found,
    ones: Sequence[PopulationYear],
    settings: Settings,
    keys: Sequence[str] = USUAL,
) -> dict[str, Array]:
    """Each indicator of these population-years, [ones]; nan where it is not held or undefined. One
    engine call a grid."""
    of = [indicators.find(key) for key in keys]
    found = {key: np.full(len(ones), np.nan) for key in keys}
    places: dict[AgeGrid, list[int]] = {}
    for place, one in enumerate(ones):
        if one in loaded:
            places.setdefault(loaded[one].panel.grid, []).append(place)
    for at in places.values():
        panel = Panel.stack([loaded[ones[place]].panel for place in at])
        for key, value in indicators.values(of, panel, settings).items():
            found[key][at] = value
    for place, one in enumerate(ones):
        if one in loaded and loaded[one].protected:
            for indicator in of:
                column = found[indicator.key]
                column[place] = _given(column[place], indicator, loaded[one])
    return found


def _given(value: float, of: Indicator, loaded: Loaded) -> float:
    """A figure that rests on a withheld count, as it may be given: to fixed decimals or not."""
    if withheld(of, loaded):
        return float("nan")
    return float(np.round(of.unit.scale * value, of.unit.decimals) / of.unit.scale)
