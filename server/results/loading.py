"""From an edition's schedules to panels: one statement, however many population-years are asked."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from engine.panel import Panel
from server.results.questions import PopulationYear
from server.sentences.names import listed
from server.sentences.text import _
from server.store import areas, schedules
from server.store.connect import Session
from server.store.records import Area, Key, Selection, Vector

MEASURES = ("deaths", "person_years", "births")


class NotInEdition(LookupError):
    """A population-year, area or year the edition does not hold (404); its text lists what it
    holds."""


@dataclass(frozen=True, slots=True)
class Loaded:
    """What an edition holds of one population-year."""

    panel: Panel  # no batch axes
    status: str  # provisional where any part of it is
    births: float | None


@dataclass(frozen=True, slots=True)
class Holdings:
    """What an edition holds at all: areas in tree order, sexes, sorted periods, status of each."""

    areas: tuple[Area, ...]
    sexes: tuple[str, ...]
    periods: tuple[str, ...]
    status: dict[PopulationYear, str]

    def name(self, area: str) -> str:
        """The area's name; its code where it has none."""
        return next((one.name for one in self.areas if one.code == area), "") or area

    def require_area(self, code: str) -> None:
        """NotInEdition where the edition has no such area."""
        codes = [area.code for area in self.areas]
        if code not in codes:
            raise NotInEdition(
                _(
                    "This edition has no area {code}. Its areas are {areas}. Choose among these.",
                    code=code,
                    areas=listed(codes, most=12),
                )
            )

    def require(self, wanted: PopulationYear) -> None:
        """NotInEdition where the edition does not hold it."""
        if wanted not in self.status:
            raise self.lacks(wanted)

    def lacks(self, wanted: PopulationYear) -> NotInEdition:
        """What is said of a population-year without counts, or with one measure alone."""
        periods = self.periods
        return NotInEdition(
            _(
                "This edition does not hold {code}, or not both its deaths and its person-years."
                " Its areas are {areas}; its sexes {sexes}; its years {first} to {last}. Choose"
                " among these.",
                code=wanted.code,
                areas=listed([area.code for area in self.areas], most=12),
                sexes=listed(self.sexes),
                first=periods[0] if periods else _("none"),
                last=periods[-1] if periods else _("none"),
            )
        )

    def previous(self, wanted: PopulationYear) -> PopulationYear | None:
        """The same area and sex a year before, where the edition holds it."""
        before = replace(wanted, period=f"{int(wanted.period) - 1:04}")
        return before if before in self.status else None


def holdings(session: Session, collection: str, number: int) -> Holdings:
    """Two statements."""
    contents = schedules.contents(session, collection, number)
    return Holdings(
        areas.listing(session, collection, number),
        contents.sexes,
        contents.periods,
        {PopulationYear(*key): status for key, status in contents.status.items()},
    )


def load(
    session: Session, collection: str, number: int, wanted: Iterable[PopulationYear]
) -> dict[PopulationYear, Loaded]:
    """Panels of those population-years that the edition holds; the others are left out.

    Persons take their first-year rule from women and men where it holds both.
    """
    asked = tuple(dict.fromkeys(wanted))
    sexes = {one.sex for one in asked}
    if "p" in sexes:
        sexes |= {"f", "m"}
    cells = schedules.load(
        session,
        collection,
        number,
        Selection(
            areas=tuple(sorted({one.area for one in asked})),
            sexes=tuple(sorted(sexes)),
            periods=tuple(sorted({one.period for one in asked})),
            measures=MEASURES,
        ),
    )
    found = ((one, _assembled(cells, one)) for one in asked)
    return {one: loaded for one, loaded in found if loaded is not None}


def _assembled(cells: dict[Key, Vector], wanted: PopulationYear) -> Loaded | None:
    own = _single(cells, wanted)
    if wanted.sex != "p":
        return own
    women, men = (_single(cells, replace(wanted, sex=sex)) for sex in ("f", "m"))
    if women is None or men is None:
        return own
    together = Panel.persons(women.panel, men.panel)
    if own is None:
        return Loaded(together, _status((women.status, men.status)), None)
    # the counts of persons may hold deaths of unknown sex: only the first-year rule is taken over
    mix = {name: getattr(together, name) for name in ("infant_weight", "infant_ratio")}
    return replace(own, panel=replace(own.panel, **mix))


def _single(cells: dict[Key, Vector], wanted: PopulationYear) -> Loaded | None:
    deaths, years, births = (
        cells.get(Key(wanted.area, wanted.sex, wanted.period, measure)) for measure in MEASURES
    )
    if deaths is None or years is None:
        return None
    grid = deaths.grid.common(years.grid)
    panel = Panel.of(
        grid,
        deaths.grid.regroup(deaths.values, grid),
        years.grid.regroup(years.values, grid),
        sex=wanted.sex,
    )
    return Loaded(
        panel,
        _status((deaths.status, years.status)),
        None if births is None else float(births.values.sum()),
    )


def _status(parts: Sequence[str]) -> str:
    return "provisional" if "provisional" in parts else "final"


def overlap(
    this: PopulationYear, that: PopulationYear, tree: Iterable[Area]
) -> PopulationYear | None:
    """The population-year whose deaths are counted in both, None where they share none.

    They overlap in the same period, where one area is or lies within the other and the sexes are
    equal or one is persons.
    """
    parents = {area.code: area.parent for area in tree}
    if this.period != that.period:
        return None
    if "p" not in (this.sex, that.sex) and this.sex != that.sex:
        return None
    sex = that.sex if this.sex == "p" else this.sex
    for inner, outer in ((this.area, that.area), (that.area, this.area)):
        if outer in _lineage(inner, parents):
            return PopulationYear(inner, sex, this.period)
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
    return replace(
        both,
        deaths=np.minimum(both.deaths, np.minimum(this.deaths, that.deaths)),
        births=np.minimum(both.births, np.minimum(this.births, that.births)),
    )
