"""From schedules by cause to the deaths by cause beside panels: those of one grid all at once."""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import reduce
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.ages import AgeGrid, Array
from engine.causes.counts import CauseCounts
from engine.causes.reassigned import comparable, completed, spread
from engine.panel import Panel
from server.results.causes import APPLIED, CAUSES, NOT_STATED, SPREAD, CauseChoice, Causes, Listed
from server.store.causes import lineages
from server.store.records import Break, Key, Vector

Cells = Mapping[Key, Vector]
Bools = NDArray[np.bool_]
DELIVERED, COUNTED, CHOSEN = range(3)  # of the axis of variants; after them one of each ratio


class Pool(NamedTuple):
    """Whose counts are summed, over which years."""

    area: str
    sex: str
    periods: tuple[str, ...]


class Place(NamedTuple):
    """A population-year, as the key of a schedule has it."""

    area: str
    sex: str
    period: str


@dataclass(frozen=True, slots=True)
class Part:
    """Deaths of a population by cause: as delivered, as counted, as chosen, and as chosen with each
    ratio a standard error higher."""

    grid: AgeGrid
    values: Array  # [variant, cause, age]; those of no stated cause last
    kinds: Array  # [kind], as delivered
    withheld: Bools  # [cause, age], where some only stand in

    def on(self, grid: AgeGrid) -> "Part":
        """Summed into coarser age groups."""
        if grid == self.grid:
            return self
        at = [self.grid.position(start) for start in grid.starts]
        hidden = np.logical_or.reduceat(self.withheld, at, axis=-1)
        return Part(grid, self.grid.regroup(self.values, grid), self.kinds, hidden)

    def plus(self, other: "Part") -> "Part":
        grid = self.grid.common(other.grid)
        one, two = self.on(grid), other.on(grid)
        hidden = one.withheld | two.withheld
        return Part(grid, one.values + two.values, one.kinds + two.kinds, hidden)


def by_cause(
    cells: Cells, panels: Mapping[Pool, Panel], listed: Listed, choice: CauseChoice
) -> dict[Pool, tuple[AgeGrid, Causes]]:
    """The causes of those populations that have counts by cause in every year, and the age groups
    they share with the panel. All have the same rows: one of no stated cause where any needs it."""
    treatment = Treatment(listed, choice)
    parts = treatment.parts(cells, _places(panels))
    summed = {pool: one for pool in panels if (one := _summed(cells, parts, pool)) is not None}
    unstated = any(np.nansum(one.values[DELIVERED, -1]) > 0 for one in summed.values())
    return {
        pool: treatment.finished(one, panels[pool], unstated=unstated)
        for pool, one in summed.items()
    }


def _places(pools: Iterable[Pool]) -> list[Place]:
    """The population-years they are made of; of persons those of women and men too."""
    found = {
        Place(pool.area, sex, period): None
        for pool in pools
        for sex in (("p", "f", "m") if pool.sex == "p" else (pool.sex,))
        for period in pool.periods
    }
    return list(found)


def _summed(cells: Cells, parts: Mapping[Place, Part], pool: Pool) -> Part | None:
    """Over the years. Persons that are women and men together are chosen within each sex."""

    def over_years(sex: str) -> Part | None:
        found = [parts.get(Place(pool.area, sex, period)) for period in pool.periods]
        known = [one for one in found if one is not None]
        return reduce(Part.plus, known) if len(known) == len(found) else None

    own = over_years(pool.sex)
    if pool.sex != "p":
        return own
    women, men = over_years("f"), over_years("m")
    if women is None or men is None:
        return own
    both = women.plus(men)
    if own is None:
        held = all(Key(pool.area, "p", period, "deaths") in cells for period in pool.periods)
        return None if held else both
    grid = own.grid.common(both.grid)
    mine, theirs = (one.on(grid).values[DELIVERED] for one in (own, both))
    return both if np.allclose(mine, theirs, rtol=1e-9, atol=1e-3, equal_nan=True) else own


class Treatment:
    """What becomes of delivered counts under a list and a choice."""

    def __init__(self, listed: Listed, choice: CauseChoice) -> None:
        self.choice, self.leaves = choice, listed.leaves
        self.row = {leaf.code: at for at, leaf in enumerate(self.leaves)}
        self.rows = listed.rows(choice.level)
        self.lineage = lineages(listed.causes)
        known = tuple(one for one in listed.ratios if one.cause in self.lineage)
        self.ratios = known if choice.ratios == APPLIED else ()
        self.kind = np.array([*(leaf.kind for leaf in self.leaves), NOT_STATED.code])
        self.kinds = tuple(dict.fromkeys(self.kind.tolist()))

    def parts(self, cells: Cells, places: Iterable[Place]) -> dict[Place, Part]:
        """Of those places that have counts by cause."""
        keys = _schedules(cells)
        alike: dict[AgeGrid, list[Place]] = {}
        for place in places:
            total, years = (cells.get(Key(*place, name)) for name in ("deaths", "person_years"))
            if place in keys and total is not None and years is not None:
                grids = {id(cells[key].grid): cells[key].grid for key in keys[place]}
                grid = reduce(AgeGrid.common, grids.values(), total.grid.common(years.grid))
                alike.setdefault(grid, []).append(place)
        found: dict[Place, Part] = {}
        for grid, several in alike.items():
            values, kinds = self._values(cells, keys, several, grid)
            hidden = self._withheld(cells, keys, several, grid)
            found |= {
                place: Part(grid, values[:, at], kinds[at], hidden[at])
                for at, place in enumerate(several)
            }
        return found

    def _values(
        self, cells: Cells, keys: Mapping[Place, list[Key]], places: list[Place], grid: AgeGrid
    ) -> tuple[Array, Array]:
        """[variant, place, cause, age] and [place, kind]."""
        deaths = counted = self._delivered(cells, keys, places, grid, "deaths")
        if any(key.measure == "counted_deaths" for place in places for key in keys[place]):
            counted = self._delivered(cells, keys, places, grid, "counted_deaths")
        final = np.array([cells[Key(*one, "deaths")].status == "final" for one in places])
        chosen = [
            self._chosen(deaths, final, self._stated(places, higher))
            for higher in (None, *self.ratios)
        ]
        ageless = np.nansum(deaths, axis=-1)
        kinds = [np.where(self.kind == kind, ageless, 0.0).sum(axis=-1) for kind in self.kinds]
        values = self._rolled_up(np.stack([deaths, counted, *chosen]), np.add)
        return values, np.stack(kinds, axis=-1)

    def _withheld(
        self, cells: Cells, keys: Mapping[Place, list[Key]], places: list[Place], grid: AgeGrid
    ) -> Bools:
        """[place, cause, age]; what is left over of an age, where a cause of it is withheld."""
        found = np.zeros((len(places), len(self.leaves) + 1, len(grid)), bool)
        for at, place in enumerate(places):
            for key in keys[place]:
                if cells[key].withheld and key.cause in self.row:
                    ages = np.searchsorted(grid.starts, cells[key].withheld, side="right") - 1
                    found[at, self.row[key.cause], ages] = True
        found[:, -1] = found.any(axis=1)
        return np.asarray(self._rolled_up(found, np.logical_or), np.bool_)

    def _delivered(
        self,
        cells: Cells,
        keys: Mapping[Place, list[Key]],
        places: list[Place],
        grid: AgeGrid,
        measure: str,
    ) -> Array:
        """[place, cause, age], with those of no stated cause. Where nothing was counted otherwise,
        the deaths were."""
        found = np.zeros((len(places), len(self.leaves), len(grid)))
        totals = np.empty((len(places), len(grid)))
        for at, place in enumerate(places):
            for key in keys[place]:
                if key.measure == "deaths" and key.cause in self.row:
                    cell = cells.get(key._replace(measure=measure), cells[key])
                    found[at, self.row[key.cause]] = cell.grid.regroup(cell.values, grid)
            total = cells.get(Key(*place, measure), cells[Key(*place, "deaths")])
            totals[at] = total.grid.regroup(total.values, grid)
        return completed(found, totals)

    def _chosen(self, deaths: Array, final: Bools, ratios: Array) -> Array:
        """The deaths as the reader chose to see them; those of no stated cause stay."""
        known, kind = deaths[..., :-1, :], self.kind[:-1]
        if self.ratios:
            known = comparable(known, ratios)
        if self.choice.ill_defined == SPREAD:
            # in a provisional year those that are pending will still be given a cause
            settled = (kind == "pending") & final[:, None]
            known = spread(known, (kind == "ill_defined") | settled, kind == "natural")
        if self.choice.undetermined == SPREAD:
            known = spread(known, kind == "undetermined", kind == "external")
        return np.concatenate([known, deaths[..., -1:, :]], axis=-2)

    def _stated(self, places: list[Place], higher: Break | None) -> Array:
        """[place, cause], nan where none is stated: the product of the ratios of later codings, one
        of them a standard error higher."""
        found = np.full((len(places), len(self.leaves)), np.nan)
        for one in self.ratios:
            before = [p.period < one.period and one.area in ("", p.area) for p in places]
            moved = [one.cause in self.lineage[leaf.code] for leaf in self.leaves]
            ratio = (one.ratio or 1.0) + (one.ratio_error or 0.0) * (one is higher)
            here = np.outer(before, moved)
            found = np.where(here, np.nan_to_num(found, nan=1.0) * ratio, found)
        return found

    def _rolled_up(self, values: Array, joined: np.ufunc) -> Array:
        """The rows that are shown, of those of the list's causes without parts."""
        if self.choice.level == CAUSES:
            return values
        tops = [self.lineage[leaf.code][-1] for leaf in self.leaves]
        starts = [tops.index(row.code) for row in self.rows]  # the list keeps parts together
        return joined.reduceat(values, [*starts, len(tops)], axis=-2)

    def finished(self, part: Part, panel: Panel, *, unstated: bool) -> tuple[AgeGrid, Causes]:
        """On the ages it shares with the panel, whose deaths they add up to to the last digits."""
        grid = panel.grid.common(part.grid)
        part = part.on(grid)
        rows = (*self.rows, NOT_STATED) if unstated else self.rows
        values, hidden = part.values[:, : len(rows)], part.withheld[: len(rows)]
        total = panel.grid.regroup(panel.deaths, grid)
        delivered, counted, chosen, *higher = values
        plain = not self.ratios and SPREAD not in (
            self.choice.ill_defined,
            self.choice.undetermined,
        )
        as_delivered = plain and np.array_equal(delivered, counted, equal_nan=True)
        deaths = _fitted(chosen, total)
        causes = Causes(
            rows,
            CauseCounts(deaths, None if as_delivered else counted),
            self.ratios,
            np.stack([one - chosen for one in higher]) if higher else None,
            dict(zip(self.kinds, part.kinds.tolist(), strict=True)),
            hidden if hidden.any() else None,
        )
        return grid, causes


def _schedules(cells: Cells) -> dict[Place, list[Key]]:
    """Those by cause, by population-year."""
    found: dict[Place, list[Key]] = {}
    for key in cells:
        if key.cause:
            found.setdefault(Place(*key[:3]), []).append(key)
    return found


def _fitted(deaths: Array, total: Array) -> Array:
    """Causes that differ from all deaths by the rounding of sums alone, brought to them."""
    together = deaths.sum(axis=-2)
    with np.errstate(divide="ignore", invalid="ignore"):
        off = total / together
    near = np.abs(off - 1.0) < 1e-3
    return deaths * np.where(near, off, 1.0)
