"""How often an interval holds the number it is meant to hold.

    python -m tests.studies.coverage --replicates 4000 --to found.json

Women under one law of death rates, so that the true number is known, in populations of several
sizes. Deaths are drawn again and again: Poisson, as the intervals suppose, and overdispersed
(negative binomial, the variance half as large again as the mean), as they are where a winter or a
heat wave moves many deaths at once. Each replicate gives a value and an interval at 95 %.
"""

import argparse
import json
import time
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import asdict, dataclass, replace
from itertools import product
from pathlib import Path

import numpy as np

from engine.ages import AgeGrid, Array
from engine.indicators import INDICATORS, Indicator, estimates
from engine.panel import Panel
from engine.settings import SETTINGS, Settings
from engine.streams import generator
from tests.factories import GRIDS, codes, gompertz_panel

SIZES = (5_000, 20_000, 100_000, 1_000_000, 5_000_000)
AGES = {key: GRIDS[key] for key in ("abridged", "single")}
LAWS = {"poisson": 1.0, "overdispersed": 1.5}  # variance of a count over its mean
AT_ONCE = 500  # replicates held in memory
REPORT = """# How often intervals hold the truth

By `python -m tests.studies.coverage`, 2026-12-01, settings almanac-2, women under one law of
rates, intervals at 95 %. Smooth numbers and counts: 4,000 replicates (a figure is sure to about
0.7); simulated ones 400 (to about 2.2), each of 400 draws. A cell has the per cent of
intervals that hold the truth with abridged, then with single ages. In brackets, where one tail is
more than 4 % and twice the other: wholly above the truth, wholly below it. After a minus sign, from
5 % on: the per cent of populations without an interval.

Overdispersed deaths have a variance half as large again as their mean. An interval allows for
chance in Poisson deaths only, so it is then too narrow, by a factor of 1.22: it holds the truth in
88 to 91 of 100.
"""
NEONATAL, STILLBORN = 0.7, 0.004  # of infant deaths; of births


@dataclass(frozen=True, slots=True)
class Coverage:
    """What became of the intervals of one indicator in one kind of population."""

    indicator: str
    smooth: bool
    ages: str
    persons: int
    law: str
    replicates: int
    without: float  # share without an interval
    covered: float  # share of intervals that hold the truth, of those there are
    above: float  # share wholly above the truth
    below: float  # share wholly below it
    bias: float  # mean of value less truth, in standard deviations of the value


def truth(grid: AgeGrid, persons: float) -> Panel:
    """Expected counts of a population, and of one ten times as large that it is part of."""
    area = _with_births(gompertz_panel(grid, people=1.0001 * persons))
    whole = _with_births(gompertz_panel(grid, people=10 * persons, level=1.8e-5, slope=0.101))
    return replace(area, whole=whole)


def _with_births(panel: Panel) -> Panel:
    live = panel.exposure[..., 0] * 1.005
    neonatal = NEONATAL * panel.deaths[..., 0]
    return replace(panel, births=np.stack([live, STILLBORN * live, neonatal], axis=-1))


def replicated(mean: Panel, times: int, law: str, rng: np.random.Generator) -> Panel:
    """Counts as chance might have had them, [replicate, age]; person-years and births are known,
    and what is known of the whole is taken as such."""
    panel = mean.over(lambda array: np.broadcast_to(array, (times, *array.shape)).copy())
    deaths = _counts(panel.deaths, law, rng)
    births = panel.births
    early = rng.binomial(deaths[..., 0].astype(int), NEONATAL)
    stillborn = _counts(births[..., 1], law, rng)
    births = np.stack([births[..., 0], stillborn, early], axis=-1)
    return replace(panel, deaths=deaths, births=births)


def _counts(mean: Array, law: str, rng: np.random.Generator) -> Array:
    excess = LAWS[law] - 1
    if excess:
        mean = rng.gamma(mean / excess, excess)
    return rng.poisson(mean).astype(float)


def measure(
    indicators: Sequence[Indicator],
    ages: str,
    persons: int,
    law: str,
    replicates: int,
    settings: Settings,
) -> Iterator[Coverage]:
    """Coverage of each indicator, from replicates drawn in parts."""
    mean = truth(AGES[ages], persons)
    vast = mean.over(lambda array: array if array.shape[-1] == 2 else array * 1e4)
    true = estimates(indicators, vast, settings)
    rng = generator("coverage", ages, str(persons), law)
    parts = []
    for first in range(0, replicates, AT_ONCE):
        drawn = replicated(mean, min(AT_ONCE, replicates - first), law, rng)
        streams = codes(drawn, f"{ages}.{persons}.{law}.{first}")
        parts.append(estimates(indicators, drawn, settings, streams=streams))
    for one in indicators:
        value, low, high = (
            np.concatenate([getattr(part[one.key], name) for part in parts])
            for name in ("value", "low", "high")
        )
        yield _coverage(
            one, float(true[one.key].value), value, low, high, ages=ages, persons=persons, law=law
        )


def _coverage(
    one: Indicator, true: float, value: Array, low: Array, high: Array, **where: object
) -> Coverage:
    known, held = np.isfinite(value), np.isfinite(low)
    above, below = np.mean(low[held] > true), np.mean(high[held] < true)
    return Coverage(
        indicator=one.key,
        smooth=one.smooth,
        replicates=len(value),
        without=float(1 - held.mean()),
        covered=float(1 - above - below),
        above=float(above),
        below=float(below),
        bias=float((value[known].mean() - true) / value[known].std()),
        **where,  # type: ignore[arg-type]
    )


def report(found: Sequence[Coverage]) -> str:
    """All tables, in the words of tests/studies/coverage.md."""
    tables = (f"## {law.capitalize()} deaths\n\n{table(found, law)}\n" for law in LAWS)
    return "\n".join((REPORT, *tables))


def table(found: Iterable[Coverage], law: str) -> str:
    """A line for each indicator, in the order of the registry, and a column for each size: the
    coverage in per cent with abridged and with single ages."""
    cells = {(one.indicator, one.persons, one.ages): one for one in found if one.law == law}
    sizes = sorted({persons for _, persons, _ in cells})
    lines = [
        "| indicator | " + " | ".join(f"{size:,}" for size in sizes) + " |",
        "| --- |" + " --- |" * len(sizes),
    ]
    for key in [key for key in INDICATORS if key in {row for row, _, _ in cells}]:
        row = (
            "; ".join(_cell(cells[where]) for ages in AGES if (where := (key, size, ages)) in cells)
            for size in sizes
        )
        lines.append(f"| {key} | " + " | ".join(row) + " |")
    return "\n".join(lines)


def _cell(one: Coverage) -> str:
    if np.isnan(one.covered):
        return "none"
    text = f"{100 * one.covered:.1f}"
    fewer, more = sorted((one.above, one.below))
    if more > max(0.04, 2 * fewer):
        text += f" ({100 * one.above:.0f} {100 * one.below:.0f})"
    if one.without >= 0.05:
        text += f" -{100 * one.without:.0f}"
    return text


def main() -> None:
    asked = argparse.ArgumentParser(description=__doc__)
    asked.add_argument("--replicates", type=int, default=400)
    asked.add_argument("--sizes", type=int, nargs="*", default=SIZES)
    asked.add_argument("--indicators", nargs="*", default=list(INDICATORS))
    asked.add_argument("--ages", nargs="*", default=list(AGES))
    asked.add_argument("--laws", nargs="*", default=list(LAWS))
    asked.add_argument("--settings", default="almanac-1")
    asked.add_argument("--draws", type=int, default=400)
    asked.add_argument("--to", type=Path, help="a JSON file, added to if it is there")
    asked.add_argument("--report", type=Path, help="a file for the tables of all that is in --to")
    choice = asked.parse_args()
    settings = replace(SETTINGS[choice.settings], draws=choice.draws)
    chosen = [INDICATORS[key] for key in choice.indicators]
    found: list[Coverage] = []
    if choice.to and choice.to.exists():
        found = [Coverage(**row) for row in json.loads(choice.to.read_text())]
    for ages, law, persons in product(choice.ages, choice.laws, choice.sizes):
        start = time.perf_counter()
        got = list(measure(chosen, ages, persons, law, choice.replicates, settings))
        again = {(ages, law, persons, one.indicator) for one in got}
        found = [one for one in found if place(one) not in again] + got
        print(f"{ages}, {law}, {persons:,}: {time.perf_counter() - start:.0f} s", flush=True)
        if choice.to:
            choice.to.write_text(json.dumps([asdict(one) for one in found], indent=0))
    text = report(found)
    print(text)
    if choice.report:
        choice.report.write_text(text)


def place(one: Coverage) -> tuple[str, str, int, str]:
    return (one.ages, one.law, one.persons, one.indicator)


if __name__ == "__main__":
    main()
