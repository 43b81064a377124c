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

from engine.panel import SEXES
from server.intake.cells import SEX_UNSTATED, Flags, Ints, parts_of, place_of
from server.intake.dealing import UNIT, Pool, dealt, in_units
from server.intake.ledger import Ledger
from server.intake.schedules import OLDEST, Aside, Block

MATTERS = ("sex", "age", "area")  # in the order in which they are dealt with
PERSONS = SEXES.index("p")
_NONE = np.zeros(0, np.int64)


@dataclass(frozen=True, slots=True)
class Part:
    """Counts of one measure and age group that lack the same, as they were delivered."""

    source: Aside
    lacks: tuple[str, ...]  # of MATTERS
    by_sex: bool  # women and men get them, or one sex that is stated

    @property
    def place(self) -> Ints:
        return self.source.place

    @property
    def units(self) -> Ints:
        """In millionths, [line]."""
        return in_units(self.source.values)

    @property
    def step(self) -> str:
        """At which of MATTERS they are dealt with."""
        return "area" if "area" in self.lacks else self.lacks[0]

    @property
    def spread(self) -> bool:
        return all(self.source.rule.chosen.get(matter) == "spread" for matter in self.lacks)

    def pick(self, lines: Flags) -> "Part":
        return replace(self, source=self.source.pick(lines))


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


def settle(ledger: Ledger, beside: Ledger | None = None, only: int = -1) -> Settled:
    """Share out, or leave out, what does not state its sex, age or area. Sums are kept to the last
    millionth; where everything is stated, nothing changes.

    Counts of one cause come with those of all causes `beside`, by which they are shared where the
    cause was stated nowhere, first among the sex that it befalls `only`.
    """
    if is_settled(ledger):
        return Settled(ledger, ledger)
    blocks: list[Block] = []
    found: list[Part] = []
    lost: list[Part] = []
    account: list[Unstated] = []
    asides = (*ledger.ageless, *ledger.grouped, *ledger.age_totals)
    measures = (*(one.measure for one in ledger.blocks), *(one.measure for one in asides))
    for measure in dict.fromkeys(measures):
        pool = Pool.of(ledger.of(measure))
        if beside is not None:
            pool = replace(pool, beside=Pool.of(beside.of(measure)).units, only=only)
        parts = unstated(ledger, measure, pool)
        made = _shared_out(ledger, pool, parts)
        found += parts
        lost += made.lost
        blocks += _written(pool, made)
        account += _account(ledger, measure, pool, made, parts)
    totals = tuple(total.pick(ledger.states(total.place)) for total in ledger.age_totals)
    after = replace(ledger, blocks=tuple(blocks), ageless=(), grouped=(), age_totals=totals)
    return Settled(after, ledger, tuple(found), tuple(lost), tuple(account))


def is_settled(ledger: Ledger) -> bool:
    """Whether all counts state their sex, age and area."""
    bare = any(not ledger.states(total.place).all() for total in ledger.age_totals)
    return not (ledger.ageless or ledger.grouped or bare)


def unstated(ledger: Ledger, measure: str, pool: Pool) -> list[Part]:
    """All counts of a measure that do not state their sex, age or area.

    A total over the ages stands for them where the file has none. Persons beside women and men are
    left out, as their total.
    """
    kinds = (ledger.grouped, ledger.ageless, ledger.age_totals)
    grouped, ageless, totals = ([one for one in kind if one.measure == measure] for kind in kinds)
    told = np.concatenate([_NONE, *(one.place for one in (*grouped, *ageless))])
    bare = [one.pick(~ledger.states(one.place) & ~np.isin(one.place, told)) for one in totals]
    found = [*grouped, *(one.once() for one in ageless), *bare]
    known = np.unique(np.concatenate([told, *(one.place for one in bare)]))
    _, sexes, years = parts_of(pool.place)
    by_persons = np.unique(years[sexes == PERSONS])
    return [part for one in found for part in _parts(ledger, one, known, by_persons)]


def _parts(ledger: Ledger, source: Aside, known: Ints, by_persons: Ints) -> Iterator[Part]:
    """The lines of a source, those together that lack the same; in years `by_persons` areas come
    with persons."""
    area, sex, year = parts_of(source.place)
    nowhere, sexless = area == len(ledger.codes), sex == SEX_UNSTATED
    persons = nowhere & (sex == PERSONS)
    split, some = sexless, source.values > 0
    if persons.any():
        some = some & ~(persons & _both_at(source.place, known))
        split = sexless | (persons & ~np.isin(year, by_persons))
    for no_area in (False, True):
        for no_sex in (False, True):
            for by_sex in (False, True):
                which = some & (nowhere == no_area) & (sexless == no_sex) & (split == by_sex)
                missing = {"sex": no_sex, "age": source.ages is None, "area": no_area}
                named = tuple(matter for matter in MATTERS if missing[matter])
                if named and which.any():
                    yield Part(source.pick(which), named, by_sex)


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
        units = pool.units.copy()
        for part in parts:
            if part.step == step and part.spread:
                given = _given(ledger, pool, part)
                units[given.cells] += given.units
                unsure[given.cells] |= (given.units > 0) & part.source.provisional[given.line]
                if given.left.any():
                    lost.append(part.pick(given.left > 0))
        pool = pool.with_units(units)
    return _Made(pool.units, unsure, lost)


@dataclass(frozen=True, slots=True)
class _Given:
    cells: Ints  # of the pool, each once
    line: Ints  # of the part, that gives to each
    units: Ints  # what each gets
    left: Ints  # [line of the part], what none gets


def _given(ledger: Ledger, pool: Pool, part: Part) -> _Given:
    to, line = _lines_of(ledger, pool, part)
    cells, which = pool.cells(to)
    left, units = part.units, np.zeros(len(cells), np.int64)
    for weights in _weights(pool, part, to, cells, which):
        got = dealt(left, line[which], weights)
        taken = np.zeros_like(left)
        np.add.at(taken, line[which], got)
        left, units = left - taken, units + got
        if not left.any():
            break
    return _Given(cells, line[which], units, left)


def _weights(pool: Pool, part: Part, to: Ints, cells: Ints, which: Ints) -> Iterator[Ints]:
    """By what cells of some lines share, and by what where those before have none of it."""
    if not len(to):
        return
    yield from _by(pool, pool.units, part, to, cells, which)
    if pool.beside is None:
        return
    befallen = np.ones(len(to), bool)
    if pool.only >= 0:
        befallen = parts_of(pool.place[to])[1] == pool.only
    for may in (befallen, np.ones(len(to), bool)):
        for weights in _by(pool, pool.beside, part, to, cells, which):
            yield np.where(may[which], weights, 0)


def _by(pool: Pool, units: Ints, part: Part, to: Ints, cells: Ints, which: Ints) -> Iterator[Ints]:
    """The counts of some cells at the ages in question, then those of their lines at all ages."""
    own, start = units[cells], pool.start[cells]
    if part.source.ages is None:
        yield np.where((start == 0) & pool.infants(to)[which], 0, own)
        yield own
        return
    starts = np.array([*pool.grid(to).starts, OLDEST + 1])
    first, last = part.source.ages  # as wide as the groups that all lines can be summed to
    low = starts[np.searchsorted(starts, first, side="right") - 1]
    high = starts[np.searchsorted(starts, min(last, OLDEST), side="right")]
    ages = (start >= low) & (start < high)
    yield np.where(ages, own, 0)
    yield np.where(ages, pool.sums(units)[to][which], 0)


def _lines_of(ledger: Ledger, pool: Pool, part: Part) -> tuple[Ints, Ints]:
    """Lines of the pool that may get some of a part, and the line of it that gives to each."""
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
    to = np.flatnonzero(may & (keys[at] == wanted))
    return to, order[at[to]]


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

    if not parts:
        return []
    stated = by_year(pool.place, pool.sums(pool.units))
    after = by_year(pool.place, pool.sums(made.units))
    found: dict[int, Counter[str]] = defaultdict(Counter)
    for part in parts:
        for year, units in by_year(part.place, part.units).items():
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
