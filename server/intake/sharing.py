"""Counts that do not state their sex, age or area: shared out, or left out.

They are shared out in proportion to the stated counts of the same year that agree in all that is
stated: first those of unknown sex, then those of unknown age, then those of unknown area, each step
by what the steps before have made. Infants are known to be infants: counts of unknown age go to
ages 1 and over, wherever age 0 is a group of its own. Where nobody is stated at the age in
question, sexes and areas share by their counts at all ages, and the age is kept.
"""

from collections import Counter, defaultdict
from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from engine.ages import AgeGrid
from engine.panel import SEXES
from server.intake.cells import SEX_UNSTATED, Flags, Ints, parts_of, place_of
from server.intake.dealing import UNIT, Pool, dealt, in_units, regrouped
from server.intake.ledger import Ledger
from server.intake.schedules import Aside, Block

MATTERS = ("sex", "age", "area")  # in the order in which they are dealt with
PERSONS = SEXES.index("p")
ALL_AGES = AgeGrid((0,))


@dataclass(frozen=True, slots=True)
class Part:
    """Counts of one measure that lack the same, as they were delivered."""

    source: Block | Aside
    grid: AgeGrid  # of their ages; one group where these are not known
    units: Ints  # [line, group], millionths
    lacks: tuple[str, ...]  # of MATTERS
    by_sex: bool  # women and men get them, or one sex that is stated

    @property
    def place(self) -> Ints:
        return self.source.place

    @property
    def step(self) -> str:
        """At which of MATTERS they are dealt with."""
        return "area" if "area" in self.lacks else self.lacks[0]

    @property
    def spread(self) -> bool:
        return all(self.source.rule.chosen.get(matter) == "spread" for matter in self.lacks)

    def pick(self, lines: Flags) -> "Part":
        return replace(self, source=self.source.pick(lines), units=self.units[lines])


@dataclass(frozen=True, slots=True)
class Unstated:
    """What became of the counts of one year; totals of others are not counted."""

    measure: str
    year: str
    stated: float
    sex: float  # shared out: of unknown sex, of unknown age, and of unknown area whatever else
    age: float
    area: float
    left_out: float
    after: float  # stated and shared out


@dataclass(frozen=True, slots=True)
class Settled:
    """Counts that state their sex, age and area."""

    ledger: Ledger
    delivered: Ledger
    parts: tuple[Part, ...] = ()  # what does not state all of them
    lost: tuple[Part, ...] = ()  # of it, what was to be shared out and had nothing to go by
    account: tuple[Unstated, ...] = ()  # by measure and year


def settle(ledger: Ledger) -> Settled:
    """Share out, or leave out, what does not state its sex, age or area. Sums are kept to the last
    millionth; where everything is stated, nothing changes."""
    placed: list[Block | Aside] = [*ledger.blocks, *ledger.age_totals]
    if not ledger.ageless and all(ledger.states(one.place).all() for one in placed):
        return Settled(ledger, ledger)
    blocks: list[Block] = []
    found: list[Part] = []
    lost: list[Part] = []
    account: list[Unstated] = []
    for measure in dict.fromkeys(one.measure for one in (*placed, *ledger.ageless)):
        pool = Pool.of([b.pick(ledger.states(b.place)) for b in ledger.of(measure)])
        parts = unstated(ledger, measure, pool)
        made = _shared_out(ledger, pool, parts)
        found += parts
        lost += made.lost
        blocks += _written(pool, made)
        account += _account(ledger, measure, pool, made, parts)
    totals = (total.pick(ledger.states(total.place)) for total in ledger.age_totals)
    after = replace(ledger, blocks=tuple(blocks), ageless=(), age_totals=tuple(totals))
    return Settled(after, ledger, tuple(found), tuple(lost), tuple(account))


def unstated(ledger: Ledger, measure: str, pool: Pool) -> list[Part]:
    """All counts of a measure that do not state their sex, age or area.

    A total over the ages stands for them where the file has none. Persons beside women and men are
    left out, as their total.
    """
    totals = [total for total in ledger.age_totals if total.measure == measure]
    ageless = [aside.once() for aside in ledger.ageless if aside.measure == measure]
    places = [ledger.places(measure), *(aside.place for aside in ageless)]
    told = np.unique(np.concatenate(places))
    bare = [total.pick(~np.isin(total.place, told)) for total in totals]
    known = np.unique(np.concatenate([told, *(total.place for total in bare)]))
    return [
        *(part for block in ledger.of(measure) for part in _parts(ledger, block, known, pool)),
        *(part for total in bare for part in _parts(ledger, total, known, pool)),
        *(part for aside in ageless for part in _parts(ledger, aside, known, pool, ageless=True)),
    ]


def _parts(
    ledger: Ledger, source: Block | Aside, known: Ints, pool: Pool, *, ageless: bool = False
) -> Iterator[Part]:
    """The lines of a source that lack something, those together that lack the same."""
    grid = source.grid if isinstance(source, Block) else ALL_AGES
    area, sex, year = parts_of(source.place)
    units = in_units(source.values.reshape(len(area), len(grid)))
    nowhere, sexless = area == len(ledger.codes), sex == SEX_UNSTATED
    _, sexes, years = parts_of(pool.place)
    persons = nowhere & (sex == PERSONS)
    some = units.any(axis=-1) & ~(persons & _both_at(source.place, known))
    split = persons & ~np.isin(year, years[sexes == PERSONS])  # where areas come by sex
    for no_area in (False, True):
        for no_sex in (False, True):
            for by_sex in (False, True):
                which = (nowhere == no_area) & (sexless == no_sex) & ((split | sexless) == by_sex)
                lines = which & some
                missing = {"sex": no_sex, "age": ageless, "area": no_area}
                named = tuple(matter for matter in MATTERS if missing[matter])
                if named and lines.any():
                    yield Part(source.pick(lines), grid, units[lines], named, by_sex)


def _both_at(persons: Ints, known: Ints) -> Flags:
    """Whether women and men stand beside places of persons."""
    area, _, year = parts_of(persons)
    found = [np.isin(place_of(area, np.full_like(area, sex), year), known) for sex in (0, 1)]
    return np.asarray(found[0] & found[1])


@dataclass(frozen=True, slots=True)
class _Made:
    units: Ints  # [cell], with what was shared out
    unsure: Flags  # [cell], with some of a provisional count
    lost: list[Part]


def _shared_out(ledger: Ledger, pool: Pool, parts: list[Part]) -> _Made:
    lost, unsure = [], np.zeros(len(pool.units), bool)
    for step in MATTERS:
        given = np.zeros_like(pool.units)
        for part in parts:
            if part.step == step and part.spread:
                line = _line_of(ledger, pool, part)
                cells, left = _given(pool, part, line)
                given += cells
                unsure |= (cells > 0) & part.source.provisional[line]
                some = np.asarray(left.any(axis=-1))
                if some.any():
                    lost.append(part.pick(some))
        pool = pool.with_units(pool.units + given)
    return _Made(pool.units, unsure, lost)


def _given(pool: Pool, part: Part, line: Ints) -> tuple[Ints, Ints]:
    """What each cell of the pool gets of a part, [cell], and what is left of it, [line, group]."""
    cells = np.flatnonzero(line >= 0)
    grid = pool.grid(line >= 0, part.grid)
    group = np.searchsorted(grid.starts, pool.start[cells], side="right") - 1
    amounts = regrouped(part.units, part.grid, grid)
    left, bins = amounts.ravel(), line[cells] * len(grid) + group
    given = np.zeros_like(pool.units)
    for weights in _weights(pool, part, cells):
        got = dealt(left, bins, weights)
        taken = np.zeros_like(left)
        np.add.at(taken, bins, got)
        left = left - taken
        given[cells] += got
    return given, left.reshape(amounts.shape)


def _weights(pool: Pool, part: Part, cells: Ints) -> Iterator[Ints]:
    """By what cells share, and by what where those that come before have none of it."""
    own = pool.units[cells]
    if "age" in part.lacks:
        yield np.where(pool.adult[cells], own, 0)
        yield own
    else:
        yield own
        yield pool.at_all_ages()[cells]


def _line_of(ledger: Ledger, pool: Pool, part: Part) -> Ints:
    """Which line of a part may give to each cell, -1 where none may."""
    no_area, no_sex = "area" in part.lacks, part.by_sex

    def key(place: Ints) -> Ints:
        area, sex, year = parts_of(place)
        return place_of(0 * area if no_area else area, 0 * sex if no_sex else sex, year)

    area, sex, _ = parts_of(pool.place)
    may = np.ones(len(area), bool)
    if no_area:
        may &= area != ledger.whole
    if no_sex:
        may &= sex != PERSONS
    wanted, order = key(pool.place), np.argsort(key(part.place), kind="stable")
    keys = key(part.place)[order]
    at = np.minimum(np.searchsorted(keys, wanted), len(keys) - 1)
    return np.where(may & (keys[at] == wanted), order[at], -1)


def _written(pool: Pool, made: _Made) -> Iterator[Block]:
    """The blocks of a pool with what was shared out; deaths keep beside them how many were
    stated."""
    laid = zip(pool.blocks, pool.laid_out(made.units), pool.laid_out(made.unsure), strict=True)
    for block, units, marks in laid:
        values = np.where(units == in_units(block.values), block.values, units / UNIT)
        shared = block.measure == "deaths" and bool((values != block.values).any())
        yield replace(
            block,
            values=values,
            provisional=block.provisional | marks.any(axis=-1),
            counted=block.values if shared else None,
        )


def _account(
    ledger: Ledger, measure: str, pool: Pool, made: _Made, parts: list[Part]
) -> list[Unstated]:
    def by_year(place: Ints, units: Ints) -> dict[int, int]:
        kept = ~ledger.is_total(place, measure)
        years, which = np.unique(parts_of(place[kept])[2], return_inverse=True)
        sums = np.zeros(len(years), np.int64)
        np.add.at(sums, which, units[kept])
        return dict(zip(years.tolist(), sums.tolist(), strict=True))

    stated, after = by_year(pool.place, pool.units), by_year(pool.place, made.units)
    found: dict[int, Counter[str]] = defaultdict(Counter)
    for part in parts:
        for year, units in by_year(part.place, part.units.sum(axis=-1)).items():
            found[year][part.step if part.spread else "left_out"] += units
    return [
        Unstated(
            measure=measure,
            year=str(year),
            stated=stated.get(year, 0) / UNIT,
            after=after.get(year, 0) / UNIT,
            **{kind: found[year][kind] / UNIT for kind in (*MATTERS, "left_out")},
        )
        for year in sorted(found)
    ]
