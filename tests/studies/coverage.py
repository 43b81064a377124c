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


def table(found: Iterable[Coverage], *, ages: str, law: str) -> str:
    """A line for each indicator, its coverage in per cent for each size; the two tails (truth below
    and above the interval) where one is twice the other or more, and the share without interval
    from 1 % on."""
    rows: dict[str, dict[int, Coverage]] = {}
    for one in found:
        if (one.ages, one.law) == (ages, law):
            rows.setdefault(one.indicator, {})[one.persons] = one
    sizes = sorted({size for row in rows.values() for size in row})
    lines = [
        "| indicator | " + " | ".join(f"{size:,}" for size in sizes) + " |",
        "| --- |" + " --- |" * len(sizes),
    ]
    for key, row in rows.items():
        cells = (_cell(row[size]) if size in row else "" for size in sizes)
        lines.append(f"| {key} | " + " | ".join(cells) + " |")
    return "\n".join(lines)


def _cell(one: Coverage) -> str:
    if np.isnan(one.covered):
        return "none"
    text = f"{100 * one.covered:.1f}"
    tails = sorted((one.above, one.below))
    if tails[1] > 0.03 and tails[1] >= 2 * tails[0]:
        text += f" ({100 * one.above:.1f}, {100 * one.below:.1f})"
    if one.without >= 0.01:
        text += f"; {100 * one.without:.0f} % without"
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
    choice = asked.parse_args()
    settings = replace(SETTINGS[choice.settings], draws=choice.draws)
    chosen = [INDICATORS[key] for key in choice.indicators]
    found: list[Coverage] = []
    if choice.to and choice.to.exists():
        found = [Coverage(**row) for row in json.loads(choice.to.read_text())]
    for ages in choice.ages:
        for law in choice.laws:
            for persons in choice.sizes:
                start = time.perf_counter()
                got = list(measure(chosen, ages, persons, law, choice.replicates, settings))
                again = {(ages, law, persons, one.indicator) for one in got}
                found = [o for o in found if (o.ages, o.law, o.persons, o.indicator) not in again]
                found += got
                print(
                    f"{ages}, {law}, {persons:,}: {time.perf_counter() - start:.0f} s", flush=True
                )
                if choice.to:
                    choice.to.write_text(json.dumps([asdict(one) for one in found], indent=0))
            print(f"\n{ages} ages, {law}\n\n{table(found, ages=ages, law=law)}\n", flush=True)


if __name__ == "__main__":
    main()
