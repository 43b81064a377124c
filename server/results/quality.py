"""How good the counts of an edition are: what is there, what the checks find in it, indices."""

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import reduce
from typing import ClassVar, Self
from urllib.parse import urlencode

import numpy as np

from engine.ages import AgeGrid, Array
from engine.quality import ENOUGH_PEOPLE, age_sex_accuracy, growth_balance, myers, whipple
from server.intake.checks import doubts
from server.intake.ledger import Ledger
from server.intake.problems import Fault
from server.intake.standing import Standing
from server.results.questions import DEFAULT_SETTINGS, Items, Keys
from server.results.releasing import released
from server.store import areas
from server.store.connect import Session
from server.store.heading import Heading
from server.store.records import Area, Key, Selection, Vector

MEASURES = ("deaths", "person_years")
LEAST_YEARS, MOST_YEARS = 4, 10  # over which registered deaths are set against ageing
LEAST_DEATHS = 1_000  # under which no share of deaths is told: it would tell of single ones
Cells = Mapping[Key, Vector]


@dataclass(frozen=True, slots=True)
class QualityQuestion:
    """How good are the counts of this edition?"""

    view: ClassVar[str] = "quality"

    figures: str = "released"
    settings: str = DEFAULT_SETTINGS  # moves nothing here; it goes on to the next page

    @classmethod
    def parse(cls, items: Items) -> Self:
        keys = Keys(items, once=("figures", "settings"))
        return cls(keys.figures(), keys.settings())

    def canonical(self) -> str:
        return urlencode([("figures", self.figures), ("settings", self.settings)])


@dataclass(frozen=True, slots=True)
class Place:
    """An area and year."""

    held: str  # complete, part (a sex or a measure is lacking in part), deaths, people, none
    provisional: bool = False
    estimated: bool = False
    doubts: tuple[str, ...] = ()  # chapters of checks that found something in it


@dataclass(frozen=True, slots=True)
class Finding:
    """What one check finds in the counts of the edition."""

    key: str
    times: int
    areas: tuple[str, ...]  # codes
    years: tuple[str, ...]  # a year, or the first and last of those taken together


@dataclass(frozen=True, slots=True)
class Indices:
    """Of one area, women and men together; nan where it cannot be told."""

    area: str
    period: str  # the newest with a population
    whipple: float
    myers: float
    accuracy: float
    registered: float  # deaths registered of 100, by the general growth balance
    open_age: int  # of the newest year
    open_share: float  # of 100 deaths of all years, those at the open age


@dataclass(frozen=True, slots=True)
class Quality:
    areas: tuple[Area, ...]
    periods: tuple[str, ...]
    places: Mapping[tuple[str, str], Place]  # by area and year
    findings: tuple[Finding, ...]
    indices: tuple[Indices, ...]

    @property
    def complete(self) -> int:
        """Areas and years that are complete."""
        return sum(one.held == "complete" for one in self.places.values())

    @property
    def provisional(self) -> tuple[str, ...]:
        """Years that are provisional somewhere."""
        return tuple(sorted({year for (_, year), one in self.places.items() if one.provisional}))


def quality(session: Session, heading: Heading, figures: str = "released") -> Quality:
    """Two statements; the checks of figures run over all that the edition holds."""
    code, number = heading.collection.code, heading.edition.number
    tree = areas.listing(session, code, number)
    held = released(session, code, number, Selection(measures=MEASURES), figures)
    cells = _without_sums(held)
    periods = tuple(sorted({key.period for key in cells}))
    told = doubts(ledger(tree, cells))
    return Quality(
        tree,
        periods,
        _places(tree, periods, cells, told),
        tuple(_finding(key, faults) for key, _, faults in told if faults),
        tuple(_indices(area, cells) for area in tree),
    )


def _without_sums(cells: Cells) -> Cells:
    """Persons are left out where women and men are held: nothing is found twice."""
    return {
        key: cell
        for key, cell in cells.items()
        if key.sex != "p" or not all(key._replace(sex=sex) in cells for sex in ("f", "m"))
    }


def ledger(tree: tuple[Area, ...], cells: Cells) -> Ledger:
    """What is stored, as checks see an upload."""
    codes = tuple(sorted({key.area for key in cells} | {area.code for area in tree}))
    wholes = {area.parent for area in tree} - {""}
    return Ledger(
        codes=codes,
        whole=codes.index(wholes.pop()) if len(wholes) == 1 else -1,
        delivered=frozenset(codes.index(area.code) for area in tree if area.delivered),
        blocks=Standing(tree, cells=cells).blocks(codes),
        spoiled=np.zeros(0, np.int64),
        unplaced=False,
        elsewhere=False,
        age_totals=(),
        ageless=(),
        grouped=(),
    )


_SPAN = re.compile(r"\b(\d{4})(?:–(\d{4}))?\b")
Told = list[tuple[str, str, list[Fault]]]  # key of the check, its chapter, what it found


def _places(
    tree: tuple[Area, ...], periods: tuple[str, ...], cells: Cells, told: Told
) -> dict[tuple[str, str], Place]:
    sexes = {key.sex for key in cells} - {"p"} or {"p"}
    by_place: dict[tuple[str, str], dict[tuple[str, str], Vector]] = {}
    for key, cell in cells.items():
        by_place.setdefault((key.area, key.period), {})[key.sex, key.measure] = cell
    doubted: dict[tuple[str, str], set[str]] = {}
    for _, chapter, faults in told:
        for fault in faults:
            for year in _years(fault, periods):
                doubted.setdefault((str(fault.values.get("area")), year), set()).add(chapter)
    return {
        (area.code, year): _place(
            by_place.get((area.code, year), {}), sexes, doubted.get((area.code, year), set())
        )
        for area in tree
        for year in periods
    }


def _place(held: Mapping[tuple[str, str], Vector], sexes: set[str], doubted: set[str]) -> Place:
    has = {measure: sum((sex, measure) in held for sex in sexes) for measure in MEASURES}
    deaths, people = has["deaths"], has["person_years"]
    if deaths == people == len(sexes):
        state = "complete"
    elif deaths and people:
        state = "part"
    else:
        state = "deaths" if deaths else "people" if people else "none"
    return Place(
        state,
        any(cell.status == "provisional" for cell in held.values()),
        any(cell.estimated for cell in held.values()),
        tuple(sorted(doubted)),
    )


def _years(fault: Fault, periods: tuple[str, ...]) -> set[str]:
    """The year of a fault, or all years held that were taken together: 2001, 2003–2007."""
    named = str(fault.values.get("year") or fault.values.get("years", ""))
    spans = [(span[1], span[2] or span[1]) for span in _SPAN.finditer(named)]
    return {year for year in periods for first, last in spans if first <= year <= last}


def _finding(key: str, faults: Iterable[Fault]) -> Finding:
    several = list(faults)
    named = [fault.values for fault in several]
    return Finding(
        key,
        sum(1 + fault.others for fault in several),
        tuple(dict.fromkeys(str(one["area"]) for one in named if "area" in one)),
        tuple(dict.fromkeys(str(one.get("year") or one.get("years", "")) for one in named)),
    )


def _indices(area: Area, cells: Cells) -> Indices:
    """Women and men together, or persons where the sexes are not held."""
    years = sorted({key.period for key in cells if key.area == area.code})
    peopled = [year for year in years if _both(cells, area.code, year, "person_years")]
    newest = peopled[-1] if peopled else ""
    nothing = float("nan")
    women, men = (cells.get(Key(area.code, sex, newest, "person_years")) for sex in ("f", "m"))
    grid, people = _both(cells, area.code, newest, "person_years") or (AgeGrid((0,)), np.zeros(1))
    accuracy = nothing
    if women and men and people.sum() >= ENOUGH_PEOPLE:
        common = women.grid.common(men.grid)
        sexes = (one.grid.regroup(one.values, common) for one in (women, men))
        accuracy = float(age_sex_accuracy(common, *sexes).index)
    return Indices(
        area.code,
        newest,
        float(whipple(grid, people)) if newest else nothing,
        float(myers(grid, people)) if newest else nothing,
        accuracy,
        _registered(area, cells, peopled) if not area.parent else nothing,
        *_open(area.code, cells, years),
    )


def _both(cells: Cells, area: str, period: str, measure: str) -> tuple[AgeGrid, Array] | None:
    """Counts of women and men together, on the groups both have; of persons where they are not."""
    women, men, persons = (cells.get(Key(area, sex, period, measure)) for sex in ("f", "m", "p"))
    if women and men:
        grid = women.grid.common(men.grid)
        parts = [one.grid.regroup(one.values, grid) for one in (women, men)]
        return grid, np.asarray(parts[0] + parts[1])
    return (persons.grid, persons.values) if persons else None


@dataclass(frozen=True, slots=True)
class _Year:
    """Deaths and people of a year on common groups."""

    year: int
    grid: AgeGrid
    deaths: Array
    people: Array


def _registered(area: Area, cells: Cells, years: list[str]) -> float:
    """Deaths registered of 100 over the last years in a row that have both counts."""
    found = [one for year in years if (one := _year(area, cells, year))]
    while found and found[-1].year - found[0].year >= len(found):  # a year is lacking
        found = found[1:]
    found = found[-MOST_YEARS - 1 :]
    if len(found) <= LEAST_YEARS:
        return float("nan")
    grid = reduce(AgeGrid.common, [one.grid for one in found])
    deaths, people = (
        np.array([one.grid.regroup(getattr(one, name), grid) for one in found])
        for name in ("deaths", "people")
    )
    between = deaths.sum(axis=0) - (deaths[0] + deaths[-1]) / 2
    span = np.array(float(found[-1].year - found[0].year))
    return 100 * float(growth_balance(grid, people[0], people[-1], between, span))


def _year(area: Area, cells: Cells, year: str) -> _Year | None:
    deaths, people = (_both(cells, area.code, year, measure) for measure in MEASURES)
    if deaths is None or people is None:
        return None
    grid = deaths[0].common(people[0])
    counts = (own.regroup(values, grid) for own, values in (deaths, people))
    return _Year(int(year), grid, *counts)


def _open(area: str, cells: Cells, years: list[str]) -> tuple[int, float]:
    """The newest year's open age, and of 100 deaths at all ages in all years those from it on."""
    found = [counts for year in years if (counts := _both(cells, area, year, "deaths"))]
    if not found:
        return 0, float("nan")
    age = found[-1][0].open_age
    told = [(grid, counts) for grid, counts in found if grid.has(age)]
    at_open = sum(float(counts[grid.position(age) :].sum()) for grid, counts in told)
    total = sum(float(counts.sum()) for _, counts in told)
    return age, 100 * at_open / total if total >= LEAST_DEATHS else float("nan")
