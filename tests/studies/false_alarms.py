"""How often each check of an upload finds something where nothing is wrong.

    python -m tests.studies.false_alarms

Clean open counts (Denmark 1974-2012, the faulty age 98 pooled into 95+) and made-up clean areas of
several sizes go through the whole reading. It writes `false_alarms.md` here, and what the page of
checks shows: `server/intake/checks/false_alarms.json`.
"""

import datetime as dt
import json
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

from engine.ages import AgeGrid, Array
from engine.streams import generator
from server.intake.checks import CHAPTERS
from server.intake.checks.alarms import KEPT, CleanCounts, FalseAlarms
from server.intake.mapping import Mapping
from server.intake.parsing import Handed, parse
from tests.factories import gompertz_rates
from tests.published import denmark
from tests.server.intake.lives import FIVES, SINGLE, stable

REPORT = Path(__file__).with_suffix(".md")
COLUMNS = Mapping(
    year="year", sex="sex", age="age", area="area", deaths="deaths", population="population"
)
SEXES = ("f", "m")
SIZES = (10_000, 50_000, 250_000, 1_000_000)  # persons in an area
BY_CAUSE = (50_000, 1_000_000)
LAWS = ("poisson", "overdispersed")
AREAS, YEARS = 10, 20
UNEVEN = 1.5  # variance over mean of a cell, beside shocks that all ages of an area and year share
SHOCK = 0.03
# causes: share of the deaths at 40, how it changes with age, and how unevenly it moves from year to
# year beside chance
CAUSES = {
    "C34": (0.10, -0.010, 0.03),
    "C50": (0.06, -0.020, 0.03),
    "C25": (0.15, -0.012, 0.03),
    "I21": (0.12, 0.010, 0.04),
    "I64": (0.05, 0.020, 0.04),
    "I50": (0.04, 0.030, 0.05),
    "J18": (0.02, 0.030, 0.15),
    "K70": (0.08, -0.030, 0.05),
    "F03": (0.003, 0.070, 0.06),
    "X64": (0.12, -0.050, 0.05),
    "X44": (0.08, -0.060, 0.08),
    "W19": (0.02, 0.015, 0.06),
    "R54": (0.01, 0.030, 0.08),
}

YOUNGEST = [{"F03": 40, "X64": 10, "X44": 15, "K70": 20}.get(code, 0) for code in CAUSES]


@dataclass(frozen=True, slots=True)
class Counts:
    """Clean counts of some areas, [area, sex, year, age]."""

    grid: AgeGrid
    deaths: Array
    people: Array
    first: int
    causes: Array | None = None  # deaths of each of CAUSES, [cause, area, sex, year, age]

    def csv(self) -> bytes:
        """Deaths and people; by cause, deaths alone, with rows of all causes beside them."""
        if self.causes is None:
            return self._csv("area,sex,year,age,deaths,population", self.deaths, "")
        rows = [self._csv("area,sex,year,age,deaths,population,cause", self.deaths, ",all causes")]
        rows += [
            self._csv("", deaths, f",{code}")
            for code, deaths in zip(CAUSES, self.causes, strict=True)
        ]
        return b"".join(rows)

    def _csv(self, heading: str, counts: Array, cause: str) -> bytes:
        labels = [label.replace("–", "-") for label in self.grid.labels]
        lines = [heading]
        for (area, sex, year), _ in np.ndenumerate(self.deaths[..., 0]):
            head = f"a{area},{SEXES[sex]},{self.first + year}"
            lines += [
                f"{head},{label},{died:.12g},{lived:.12g}{cause}"
                for label, died, lived in zip(
                    labels, counts[area, sex, year], self.people[area, sex, year], strict=True
                )
            ]
        return "\n".join(lines).encode() + b"\n"


def danish(grid: AgeGrid) -> Counts:
    panels = [denmark.panel(sex).regroup(grid) for sex in ("female", "male")]
    deaths, people = (
        np.stack([getattr(panel, name) for panel in panels])[None]
        for name in ("deaths", "exposure")
    )
    return Counts(grid, deaths, people, denmark.YEARS[0])


def simulated(grid: AgeGrid, persons: int, law: str, seed: int) -> Counts:
    """Areas whose levels of mortality differ by a tenth, fall by 1 % a year, and whose populations
    grow or shrink slowly, with waves of births; ages are stated as they are."""
    rng = generator("false alarms", f"{grid.code} {persons} {law} {seed}")
    level = np.array([1.6e-5, 2.8e-5])[:, None] * np.exp(rng.normal(0, 0.1, (AREAS, 1, 1)))
    now = level * np.exp(-0.01 * np.arange(YEARS))
    rates = gompertz_rates(grid, level=now, slope=0.1, infant=0.004)
    shares = np.stack([[stable(one, grid) for one in sexes] for sexes in rates[:, :, 0]])
    starts, widths = np.array(grid.starts, float), np.append(grid.widths[:-1], 10.0)
    born = np.arange(YEARS)[:, None] - (starts + widths / 2)
    wave = 1 + 0.08 * np.sin(born / 9 + rng.uniform(0, 6, (AREAS, 1, 1, 1)))
    growth = np.exp(rng.normal(0.002, 0.006, (AREAS, 1, 1, 1)) * np.arange(YEARS)[:, None])
    people = persons / 2 * shares[:, :, None, :] * wave * growth
    people = np.round(people * rng.normal(1, 0.002, people.shape))
    mean = rates * people
    if law == "overdispersed":
        mean = mean * np.exp(rng.normal(0, SHOCK, (AREAS, 1, YEARS, 1)))
        mean = rng.gamma(np.maximum(mean, 1e-9) / (UNEVEN - 1), UNEVEN - 1)
    return Counts(grid, rng.poisson(mean).astype(float), people, 2001)


def by_cause(counts: Counts, seed: int) -> Counts:
    """The same deaths parted among causes, whose shares change with age, slowly with the years, and
    unevenly from year to year."""
    rng = generator("false alarms by cause", f"{counts.grid.code} {seed}")
    at_40, slope, uneven = (
        np.array(of)[:, None, None, None, None] for of in zip(*CAUSES.values(), strict=True)
    )
    ages = np.array(counts.grid.starts) - 40.0
    size = counts.deaths.shape[:3]
    trend = rng.normal(0, 0.01, (len(CAUSES), size[0], 1, 1, 1)) * np.arange(size[2])[:, None]
    moves = rng.normal(0, uneven, (len(CAUSES), size[0], 1, size[2], 1))
    weights = at_40 * np.exp(slope * ages + trend + moves)
    weights = np.where(
        (np.array(YOUNGEST)[:, None, None, None, None] > counts.grid.starts), 0, weights
    )
    weights = np.moveaxis(weights / weights.sum(axis=0), 0, -1)
    weights = np.broadcast_to(weights, (*counts.deaths.shape, len(CAUSES)))
    parted = rng.multinomial(np.round(counts.deaths).astype(np.int64), weights)
    return replace(counts, causes=np.moveaxis(parted, -1, 0).astype(float))


def alarms(counts: Counts) -> Counter[str]:
    """How often each check found something."""
    mapping = COLUMNS
    if counts.causes is not None:
        mapping = replace(COLUMNS, cause="cause", cause_list="short")
    found = parse([Handed("counts", "clean.csv", counts.csv(), mapping)]).problems
    told: Counter[str] = Counter()
    for problem in found:
        told[problem.key] += 1 + problem.others
    return told


GRIDS = {"single years": SINGLE, "five-year groups": FIVES}


def clean(repeats: int) -> Iterator[tuple[str, list[Counts]]]:
    """What is looked at, by name."""
    yield "Denmark 1974–2012, single years to 95+", [danish(SINGLE)]
    yield "Denmark 1974–2012, five-year groups to 95+", [danish(FIVES)]
    yield "Denmark 1974–2012, five-year groups to 85+", [danish(AgeGrid(FIVES.starts[:-2]))]
    for ages, grid in GRIDS.items():
        for law in LAWS:
            for persons in SIZES:
                name = f"areas of {persons:,} persons, {law}, {ages}"
                yield name, [simulated(grid, persons, law, seed) for seed in range(repeats)]
    for persons in BY_CAUSE:
        name = f"areas of {persons:,} persons, overdispersed, by cause"
        made = (simulated(FIVES, persons, "overdispersed", seed) for seed in range(repeats))
        yield name, [by_cause(one, seed) for seed, one in enumerate(made)]


def measure(repeats: int, *, only: str = "") -> FalseAlarms:
    """Alarms of each check for 1,000 areas, sexes and years."""
    data, rates = [], {}
    for name, several in clean(repeats):
        if only not in name:
            continue
        told = sum((alarms(one) for one in several), Counter())
        lines = sum(one.deaths[..., 0].size for one in several)
        data.append(CleanCounts(name, lines))
        rates[name] = {key: 1000 * count / lines for key, count in told.items()}
    return FalseAlarms(dt.date.today().isoformat(), tuple(data), rates)


def table(found: FalseAlarms) -> str:
    """The report, a line for each check that told anything and one for those that told nothing."""
    checks = [check for chapter in CHAPTERS for check in chapter.checks]
    lines = [
        "# How often checks find something where nothing is wrong",
        "",
        f"By `python -m tests.studies.false_alarms`, {found.measured}. Findings for 1,000 areas, "
        "sexes and years of clean counts. Each made-up collection has "
        f"{AREAS} areas, {YEARS} years and two sexes; “overdispersed” cells vary {UNEVEN} times as "
        f"much as Poisson ones, beside shocks of {100 * SHOCK:.0f} % that all ages of an area and "
        "year share.",
        "",
        "| clean counts | areas, sexes, years | any warning | which |",
        "| --- | --- | --- | --- |",
    ]
    for one in found.data:
        rates = found.rates[one.name]
        which = ", ".join(f"{key} {rate:.2g}" for key, rate in sorted(rates.items()))
        lines.append(f"| {one.name} | {one.lines:,} | {sum(rates.values()):.2g} | {which or '–'} |")
    lines += ["", "| check | worst | in all |", "| --- | --- | --- |"]
    for check in checks:
        rate = found.of(check.key)
        if rate.worst:
            lines.append(f"| {check.key} | {rate.worst:.2g} | {rate.mean:.2g} |")
    silent = sum(not found.of(check.key).worst for check in checks)
    lines += ["", f"The other {silent} checks told nothing anywhere.", ""]
    return "\n".join(lines)


def main(repeats: int = 10) -> None:
    found = measure(repeats)
    REPORT.write_text(table(found), encoding="utf-8")
    KEPT.write_text(found.to_json(), encoding="utf-8")
    print(table(found))
    print(json.dumps({"kept": str(KEPT.name), "lines": sum(one.lines for one in found.data)}))


if __name__ == "__main__":
    main()
