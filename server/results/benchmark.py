"""The areas that an area is set against: chosen once, on whole areas, from other years pooled."""

from dataclasses import dataclass
from functools import reduce

import numpy as np
from numpy.typing import NDArray

from engine import gaps, indicators
from engine.ages import AgeGrid, Array
from engine.panel import Panel
from engine.settings import Settings, span
from server.results.holdings import Holdings
from server.results.keys import PopulationYear
from server.results.loading import Cells
from server.results.releasing import released
from server.store.connect import Session
from server.store.heading import Heading
from server.store.records import Key, Selection

AROUND = 5  # years before and after those asked in which the benchmark is chosen
MEASURES = ("deaths", "person_years")


@dataclass(frozen=True, slots=True)
class Chosen:
    """The areas that make the benchmark, and what they were chosen by."""

    candidates: tuple[str, ...]  # areas without parts that hold other years, sorted by code
    length: Array  # [candidate], life expectancy in the other years
    lived: Array  # [candidate], person-years in them
    member: NDArray[np.bool_]  # [candidate]
    years: tuple[str, ...]  # the other years; not every area need have all

    @property
    def members(self) -> tuple[str, ...]:
        return tuple(one for one, taken in zip(self.candidates, self.member, strict=True) if taken)


def choose(
    session: Session,
    heading: Heading,
    held: Holdings,
    of: PopulationYear,
    settings: Settings,
    least: float,
    figures: str,
    *,
    ages: AgeGrid,
) -> Chosen:
    """From pooled counts of the years around those asked, none of them itself: so what chance did
    in the year asked has no part in the choice. Years parted by a break are left out, and areas
    counted in coarser ages than the one asked. One statement."""
    wholes = {area.parent for area in held.areas}
    leaves = tuple(sorted(area.code for area in held.areas if area.code not in wholes))
    own = span(of.period, settings.years)
    first, last = int(own[0]) - AROUND, int(own[-1]) + AROUND
    years = tuple(year for year in held.periods if year not in own and first <= int(year) <= last)
    selection = Selection(leaves, (of.sex,), years, measures=MEASURES, cause="")
    collection, number = heading.collection.code, heading.edition.number
    cells = released(session, collection, number, selection, figures)
    known = {
        area: found
        for area in leaves
        if (found := [year for year in years if _held(cells, held, area, of.sex, year, own)])
        and _as_fine(cells, [Key(area, of.sex, year, "deaths") for year in found], ages)
    }
    if not known:
        return Chosen((), np.zeros(0), np.zeros(0), np.zeros(0, bool), years)
    panel = _pooled(cells, known, of.sex)
    length = indicators.values([indicators.find("e0")], panel, settings)["e0"]
    lived = panel.exposure.sum(axis=-1)
    return Chosen(tuple(known), length, lived, gaps.chosen(length, lived, least), years)


def _held(
    cells: Cells, held: Holdings, area: str, sex: str, year: str, own: tuple[str, ...]
) -> bool:
    """Whether both counts are held, and no break lies between the year and those asked."""
    first, last = min(year, *own), max(year, *own)
    whole = all(Key(area, sex, year, measure) in cells for measure in MEASURES)
    return whole and not held.parted(first, last, area)


def _as_fine(cells: Cells, keys: list[Key], ages: AgeGrid) -> bool:
    return all(set(ages.starts) <= set(cells[key].grid.starts) for key in keys)


def _pooled(cells: Cells, known: dict[str, list[str]], sex: str) -> Panel:
    """The counts of each area's years added up, [area, age], on the ages that all share."""
    keys = {
        (area, measure): [Key(area, sex, year, measure) for year in years]
        for area, years in known.items()
        for measure in MEASURES
    }
    grids = {cells[key].grid for several in keys.values() for key in several}
    grid = reduce(AgeGrid.common, sorted(grids, key=lambda one: one.code))

    def summed(measure: str) -> Array:
        return np.stack(
            [
                np.sum(
                    [
                        cells[key].grid.regroup(cells[key].values, grid)
                        for key in keys[area, measure]
                    ],
                    axis=0,
                )
                for area in known
            ]
        )

    return Panel.of(grid, summed("deaths"), summed("person_years"), sex=sex)
