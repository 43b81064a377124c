"""Deaths beside person-years on the groups both have, and the same over all years together."""

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from engine.ages import AgeGrid, Array
from engine.panel import SEXES
from server.intake.cells import YEARS, Flags, Ints, parts_of
from server.intake.ledger import Ledger
from server.intake.problems import Fault, Value
from server.intake.schedules import Block


@dataclass(frozen=True)
class Rated:
    """Deaths and person-years of the same places. Where years are pooled, a place is one area and
    sex, told as year 0."""

    grid: AgeGrid
    place: Ints  # [line], in order
    deaths: Array  # [line, age]
    people: Array  # [line, age]
    first: Ints  # [line], the first line of the block that it is made of
    block: Block  # the deaths, whose rows are named; on this grid
    years: Ints  # [line], how many years are in it

    @cached_property
    def rates(self) -> Array:
        with np.errstate(all="ignore"):
            return np.asarray(self.deaths / self.people)

    @cached_property
    def starts(self) -> Ints:
        return np.array(self.grid.starts)

    def pooled(self) -> "Rated":
        """All years of each area and sex together."""
        series = self.place // YEARS
        begins = np.flatnonzero(np.append(True, series[1:] != series[:-1])[: len(series)])
        ends = np.append(begins[1:], len(series))
        return Rated(
            self.grid,
            series[begins] * YEARS,
            np.add.reduceat(self.deaths, begins, axis=0),
            np.add.reduceat(self.people, begins, axis=0),
            begins,
            self.block,
            ends - begins,
        )

    def of(self, sex: str) -> Ints:
        """Lines of a sex."""
        return np.flatnonzero(parts_of(self.place)[1] == SEXES.index(sex))

    def couples(self) -> tuple[Ints, Ints]:
        """Lines of women and of men of the same areas and years."""
        women, men = self.of("f"), self.of("m")
        shift = (SEXES.index("m") - SEXES.index("f")) * YEARS
        _, left, right = np.intersect1d(
            self.place[women] + shift, self.place[men], assume_unique=True, return_indices=True
        )
        return women[left], men[right]

    def fault(self, ledger: Ledger, line: int, age: int, values: dict[str, Value]) -> Fault:
        """A fault at an age of a line; the row is the first that the line is made of."""
        area, sex, year = parts_of(int(self.place[line]))
        named: dict[str, Value] = {"area": ledger.codes[area], "sex": SEXES[sex], "year": str(year)}
        if not year:
            last = int(self.first[line] + self.years[line] - 1)
            ends = [int(self.block.place[at]) % YEARS for at in (int(self.first[line]), last)]
            named["year"] = "–".join(dict.fromkeys(map(str, ends)))
        lines = slice(int(self.first[line]), int(self.first[line] + self.years[line]))
        return self.block.fault(self.block.row[lines, age], named | values)


def rated(ledger: Ledger, *, parts: bool = False) -> Iterator[Rated]:
    """A record for each two blocks that share places; with `parts` only areas that hold no others,
    and no persons beside women and men."""
    for pair in ledger.pairs:
        deaths, people = pair.deaths.regroup(pair.grid), pair.people.regroup(pair.grid)
        if parts:
            keep = unsummed(ledger, deaths.place)
            if not keep.all():
                deaths, people = deaths.pick(keep), people.pick(keep)
        if len(deaths.place):
            lines = np.arange(len(deaths.place))
            years = np.ones(len(lines), np.int64)
            yield Rated(pair.grid, deaths.place, deaths.values, people.values, lines, deaths, years)


def unsummed(ledger: Ledger, place: Ints) -> Flags:
    """Places that are no sum of others: not the whole, nor persons where women and men are."""
    area, sex, _ = parts_of(place)
    persons = sex == SEXES.index("p")
    return np.asarray((area != ledger.whole) & ~(persons & (~persons).any()))
