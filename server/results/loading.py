"""From an edition's schedules to panels: one statement, however many population-years are asked."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any, Self

import numpy as np
from numpy.typing import NDArray

from engine.ages import AgeGrid, Array
from engine.indicators import Indicator
from engine.panel import BIRTHS, Panel
from engine.settings import Settings, span
from server.results.by_cause import Pool, by_cause
from server.results.causes import CauseChoice, Causes, Listed
from server.results.questions import PopulationYear
from server.results.releasing import released
from server.store.connect import Session
from server.store.records import MEASURES, Area, Key, Selection, Vector

Cells = dict[Key, Vector]


@dataclass(frozen=True, slots=True)
class Loaded:
    """What an edition holds of one population-year."""

    panel: Panel  # no batch axes
    status: str  # provisional where any part of it is
    withheld: frozenset[int] = frozenset()  # starts of its groups whose deaths only stand in
    protected: bool = False  # something it rests on is withheld or rounded
    births_withheld: frozenset[str] = frozenset()  # of engine.panel.BIRTHS
    estimated: bool = False  # its counts were split by shares, or worked out from rates
    causes: Causes | None = None  # where they were asked for and every year has some
    rounded: int = 0  # the base that counts it rests on are rounded to; 0: as counted

    def withheld_on(self, grid: AgeGrid) -> NDArray[np.bool_]:
        """Groups of a grid it can be summed to that hold a withheld one, [age]."""
        ends = [*grid.starts[1:], np.inf]
        return np.array(
            [
                any(start <= age < end for age in self.withheld)
                for start, end in zip(grid.starts, ends, strict=True)
            ]
        )


@dataclass(frozen=True, slots=True)
class Shared:
    """Counts that are part of two populations: whose, and in which years."""

    area: str
    sex: str
    periods: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Beside:
    """What figures need besides the counts of the populations asked for."""

    years: int = 1  # pooled: the year asked for and those before it
    parents: Mapping[str, str] = field(default_factory=dict)  # area to the one it is part of
    standard: PopulationYear | None = None  # whose people weight the ages
    causes: CauseChoice | None = None  # how deaths by cause are shown; None: not asked for

    @classmethod
    def of(cls, settings: Settings, tree: Iterable[Area], *of: Indicator) -> Self:
        """What these settings and indicators need."""
        codes = {one.needs.standard for one in of if one.needs.standard}
        return cls(
            settings.years,
            {area.code: area.parent for area in tree if area.parent},
            PopulationYear.parse(codes.pop()) if codes else None,
        )


def load(
    session: Session,
    collection: str,
    number: int,
    wanted: Iterable[PopulationYear | Shared],
    beside: Beside = Beside(),
    *,
    figures: str = "released",
) -> "Found":
    """Panels of those population-years that the edition holds; the others are left out, those too
    of which it lacks one of the years to be pooled. One statement; with causes of death one or two
    more, which read their list.

    Persons take their first-year rule from women and men where it holds both. As released,
    stand-ins take the place of withheld counts; in full, nothing is withheld.
    """
    asked = tuple(dict.fromkeys(wanted))
    listed = Listed.read(session, collection, number, beside.causes) if beside.causes else None
    chosen = needed(asked, beside)
    cells = released(session, collection, number, chosen, figures)
    return assembled(cells, asked, beside, listed)


def needed(wanted: Iterable[PopulationYear | Shared], beside: Beside = Beside()) -> Selection:
    """The schedules that panels of these population-years are made of."""
    pools = [_pool(one, beside.years) for one in wanted]
    wholes = [_whole(one, beside) for one in wanted if isinstance(one, PopulationYear)]
    pools += [_pool(one, beside.years) for one in wholes if one]
    pools += [_pool(beside.standard, 1)] if beside.standard else []
    sexes = {pool.sex for pool in pools}
    if "p" in sexes:
        sexes |= {"f", "m"}
    return Selection(
        areas=tuple(sorted({pool.area for pool in pools})),
        sexes=tuple(sorted(sexes)),
        periods=tuple(sorted({period for pool in pools for period in pool.periods})),
        measures=MEASURES,
        cause="" if beside.causes is None else None,
    )


def assembled(
    cells: Cells,
    wanted: Iterable[PopulationYear | Shared],
    beside: Beside = Beside(),
    listed: Listed | None = None,
) -> "Found":
    """Panels of those population-years that these schedules hold, by the causes that are listed; as
    `load`."""
    asked = tuple(dict.fromkeys(wanted))
    wholes: dict[PopulationYear | Shared, PopulationYear | None] = {
        one: _whole(one, beside) for one in asked if isinstance(one, PopulationYear)
    }
    pools = {one: _pool(one, beside.years) for one in (*asked, *wholes.values()) if one}
    standard = _pool(beside.standard, 1) if beside.standard else None
    found = {one: _assembled(cells, pool) for one, pool in pools.items()}
    if beside.causes and listed and listed.causes:
        found |= _with_causes(cells, {one: pools[one] for one in asked}, found, listed, beside)
    weights = _assembled(cells, standard) if standard else None
    return {
        one: _with(own, found[whole] if whole else None, weights)
        for one in asked
        if (own := found[one]) is not None
        for whole in (wholes.get(one),)
    }


Found = dict[PopulationYear | Shared, Loaded]


def _pool(one: "PopulationYear | Shared", years: int) -> Pool:
    if isinstance(one, Shared):
        return Pool(one.area, one.sex, one.periods)
    return Pool(one.area, one.sex, span(one.period, years))


def _whole(one: PopulationYear, beside: Beside) -> PopulationYear | None:
    parent = beside.parents.get(one.area, "")
    return replace(one, area=parent) if parent else None


def _with(own: Loaded, whole: Loaded | None, standard: Loaded | None) -> Loaded:
    """The panel with those beside it, on its grid."""
    panel = own.panel
    others = {"whole": whole, "standard": standard}
    beside: dict[str, Any] = {
        name: _on(other.panel, panel.grid) for name, other in others.items() if other is not None
    }
    held = [own, *(one for one in others.values() if one is not None)]
    return replace(
        own,
        panel=replace(panel, **beside),
        protected=any(one.protected for one in held),
        rounded=max(one.rounded for one in held),
    )


def _with_causes(
    cells: Cells,
    pools: Mapping[PopulationYear | Shared, Pool],
    found: Mapping[PopulationYear | Shared, Loaded | None],
    listed: Listed,
    beside: Beside,
) -> dict[PopulationYear | Shared, Loaded]:
    """Those that have counts by cause, on the age groups that these share with them."""
    held = {one: own for one in pools if (own := found[one]) is not None}
    panels = {pools[one]: own.panel for one, own in held.items()}
    causes = by_cause(cells, panels, listed, beside.causes or CauseChoice())
    made = {}
    for one, own in held.items():
        if pools[one] in causes:
            grid, known = causes[pools[one]]
            hidden = np.array(grid.starts)[own.withheld_on(grid)]
            made[one] = replace(
                own,
                panel=own.panel.regroup(grid),
                withheld=frozenset(hidden.tolist()),
                protected=own.protected or known.withheld is not None,
                causes=known,
            )
    return made


def _on(other: Panel, grid: AgeGrid) -> Panel | None:
    """Another panel on this grid; None where its groups are coarser."""
    return other.regroup(grid) if set(grid.starts) <= set(other.grid.starts) else None


def _assembled(cells: Cells, pool: Pool) -> Loaded | None:
    own = _summed(cells, pool)
    if pool.sex != "p":
        return own
    women, men = (_summed(cells, pool._replace(sex=sex)) for sex in ("f", "m"))
    if women is None or men is None:
        return own
    together = Panel.persons(women.panel, men.panel)
    protected = women.protected or men.protected
    if own is None:
        status = _status((women.status, men.status))
        withheld = women.births_withheld | men.births_withheld
        return Loaded(
            together,
            status,
            women.withheld | men.withheld,
            protected,
            withheld,
            women.estimated or men.estimated,
            rounded=max(women.rounded, men.rounded),
        )
    # the counts of persons may hold deaths of unknown sex: only the first-year rule is taken over
    births = np.where(np.isnan(own.panel.births), together.births, own.panel.births)
    mix = {name: getattr(together, name) for name in ("infant_weight", "infant_ratio")}
    mixed = own.protected or 0 in women.withheld | men.withheld
    return replace(own, panel=replace(own.panel, births=births, **mix), protected=mixed)


def _summed(cells: Cells, pool: Pool) -> Loaded | None:
    parts = [_single(cells, pool, period) for period in pool.periods]
    found = [part for part in parts if part is not None]
    if len(found) < len(parts):
        return None
    if len(found) == 1:
        return found[0]
    return Loaded(
        Panel.pooled([part.panel for part in found]),
        _status([part.status for part in found]),
        frozenset().union(*(part.withheld for part in found)),
        any(part.protected for part in found),
        frozenset().union(*(part.births_withheld for part in found)),
        any(part.estimated for part in found),
        rounded=max(part.rounded for part in found),
    )


def _single(cells: Cells, pool: Pool, period: str) -> Loaded | None:
    deaths, years, *births = (
        cells.get(Key(pool.area, pool.sex, period, measure)) for measure in MEASURES[:5]
    )
    if deaths is None or years is None:
        return None
    grid = deaths.grid.common(years.grid)
    panel = Panel.of(
        grid,
        deaths.grid.regroup(deaths.values, grid),
        years.grid.regroup(years.values, grid),
        sex=pool.sex,
    )
    held = [one if one is not None and not one.withheld else None for one in births]
    counted = [np.nan if one is None else float(one.values.sum()) for one in held]
    return Loaded(
        replace(panel, births=np.array(counted), counted=_counted(cells, pool, period, grid)),
        _status((deaths.status, years.status)),
        frozenset({*deaths.withheld, *years.withheld}),
        any(bool(one.withheld or one.rounded) for one in (deaths, years, *births) if one),
        frozenset(
            name
            for name, one in zip(BIRTHS, births, strict=True)
            if one is not None and one.withheld
        ),
        deaths.estimated or years.estimated,
        rounded=deaths.rounded,
    )


def _counted(cells: Cells, pool: Pool, period: str, grid: AgeGrid) -> Array | None:
    """Deaths as counted, where others were shared out among them. Of a group whose deaths are
    withheld nothing is told: those that stand in for them count."""
    deaths, counted = (
        cells.get(Key(pool.area, pool.sex, period, measure))
        for measure in ("deaths", "counted_deaths")
    )
    if deaths is None or counted is None:
        return None
    hidden = np.isin(counted.grid.starts, list(deaths.withheld))
    values = np.where(hidden, deaths.grid.regroup(deaths.values, counted.grid), counted.values)
    return counted.grid.regroup(values, grid)


def _status(parts: Sequence[str]) -> str:
    return "provisional" if "provisional" in parts else "final"


def overlap(
    this: PopulationYear, that: PopulationYear, tree: Iterable[Area], years: int = 1
) -> Shared | None:
    """The counts that are part of both, None where they share none.

    They overlap in the years both pool, where one area is or lies within the other and the sexes
    are equal or one is persons.
    """
    parents = {area.code: area.parent for area in tree}
    both = set(span(this.period, years)) & set(span(that.period, years))
    if not both:
        return None
    if "p" not in (this.sex, that.sex) and this.sex != that.sex:
        return None
    sex = that.sex if this.sex == "p" else this.sex
    for inner, outer in ((this.area, that.area), (that.area, this.area)):
        if outer in _lineage(inner, parents):
            return Shared(inner, sex, tuple(sorted(both)))
    return None


def _lineage(area: str, parents: dict[str, str]) -> Iterable[str]:
    while area:
        yield area
        area = parents.get(area, "")


def shared_part(shared: Panel, this: Panel, that: Panel) -> Panel:
    """The population counted in both panels, on the grid they share.

    An area delivered as such may count fewer than its parts do: no more are shared than it counts.
    """
    both = shared.regroup(this.grid)
    counted = None
    if any(panel.counted is not None for panel in (both, this, that)):
        counted = np.minimum(both.counts, np.minimum(this.counts, that.counts))
    return replace(
        both,
        counted=counted,
        deaths=np.minimum(both.deaths, np.minimum(this.deaths, that.deaths)),
        births=np.minimum(both.births, np.minimum(this.births, that.births)),
    )
