"""How often intervals that rest on smoothing over age hold the number they are meant to hold.

    python -m tests.studies.smoothness --replicates 1000

Two questions. The interval of the smooth mode, drawn from what the counts leave open; and the delta
intervals of numbers read off smoothed rates, which take the chosen smoothness as given. A law with
straight logarithms of rates flatters every smoother, so the true rates are also those of Denmark in
four periods, drawn smooth from millions of person-years; deaths are Poisson in populations smaller
than that. For mode and rates alike the truth is what ever more people on the same grid would give.
"""

import argparse
from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from engine.ages import AgeGrid, Array
from engine.indicators import INDICATORS, estimates
from engine.panel import Panel
from engine.settings import SETTINGS, Settings
from engine.smoothing import Basis, fit
from engine.streams import generator
from tests.factories import GRIDS, codes, gompertz_panel
from tests.published import denmark

SOUND, LAST = 97, 100  # the last age that is sound in the file; where the open group begins
PERIODS = {
    "women 2008-2012": ("female", 2008),
    "men 1988-1992": ("male", 1988),
    "women 1978-1982": ("female", 1978),
    "men 2008-2012": ("male", 2008),
}
TRUTHS = ("law", *PERIODS)
AT_ONCE = 250  # replicates held in memory


@dataclass(frozen=True, slots=True)
class Held:
    """What became of the intervals of one number in one kind of population."""

    indicator: str
    settings: str
    truth: str
    ages: str
    persons: int
    covered: float
    above: float  # share wholly above the truth
    below: float
    bias: float  # of the value, in its own standard deviations
    width: float  # mean width

    def __str__(self) -> str:
        return (
            f"{self.indicator:8s} {self.settings:17s} {self.truth:16s} {self.ages:9s} "
            f"{self.persons:>9,} {100 * self.covered:6.1f} ({100 * self.above:.1f}, "
            f"{100 * self.below:.1f}) bias {self.bias:+.2f} width {self.width:.4g}"
        )


def truth(name: str, grid: AgeGrid, persons: float) -> Panel:
    """Expected counts of so many persons."""
    if name == "law":
        return gompertz_panel(GRIDS["single"], people=persons).regroup(grid)
    sex, first = PERIODS[name]
    at = first - denmark.YEARS[0]
    counts = denmark.panel(sex)[at : at + 5]
    deaths, years = counts.deaths.sum(axis=0), counts.exposure.sum(axis=0)
    mx = np.append(_drawn_smooth(deaths, years), 0.5)
    exposure = np.append(years[: SOUND + 1], np.zeros(LAST - SOUND))
    for age in range(SOUND + 1, LAST + 1):
        exposure[age] = exposure[age - 1] * np.exp(-mx[age - 1])
    exposure *= persons / exposure.sum()
    return Panel.of(GRIDS["single"], mx * exposure, exposure, sex=sex[0]).regroup(grid)


def _drawn_smooth(deaths: Array, years: Array) -> Array:
    """Rates at ages 0 to 99: as counted below 10, then smooth; at the end their logarithms rise
    evenly."""
    inside = slice(10, SOUND + 1)
    ages = np.arange(10, SOUND + 1) + 0.5
    logs = fit(Basis(10, SOUND + 1, 18), ages, deaths[inside], years[inside]).log_rates(ages)
    rise = (logs[-3] - logs[-8]) / 5
    logs[-2:] = logs[-3] + rise * np.arange(1, 3)
    above = logs[-1] + rise * np.arange(1, LAST - SOUND)
    return np.concatenate([deaths[:10] / years[:10], np.exp(logs), np.exp(above)])


def measure(
    keys: list[str], settings: Settings, name: str, ages: str, persons: int, replicates: int
) -> Iterator[Held]:
    chosen = [INDICATORS[key] for key in keys]
    mean = truth(name, GRIDS[ages], persons)
    vast = replace(mean, deaths=mean.deaths * 1e5, exposure=mean.exposure * 1e5)
    true = estimates(chosen, vast, settings)
    rng = generator("smoothness", name, ages, str(persons))
    parts = []
    for first in range(0, replicates, AT_ONCE):
        many = min(AT_ONCE, replicates - first)
        panel = Panel.stack([mean] * many)
        panel = replace(panel, deaths=rng.poisson(panel.deaths).astype(float))
        streams = codes(panel, f"{name}.{ages}.{persons}.{first}")
        parts.append(estimates(chosen, panel, settings, streams=streams))
    for one in chosen:
        value, low, high = (
            np.concatenate([getattr(part[one.key], column) for part in parts])
            for column in ("value", "low", "high")
        )
        at, held = float(true[one.key].value), np.isfinite(low)
        above, below = np.mean(low[held] > at), np.mean(high[held] < at)
        bias = float((np.nanmean(value) - at) / np.nanstd(value))
        width = float(np.mean((high - low)[held]))
        covered = float(1 - above - below)
        where = (settings.key, name, ages, persons, covered, float(above), float(below))
        yield Held(one.key, *where, bias, width)


def main() -> None:
    asked = argparse.ArgumentParser(description=__doc__)
    asked.add_argument("--replicates", type=int, default=200)
    asked.add_argument("--sizes", type=int, nargs="*", default=[20_000, 100_000, 1_000_000])
    asked.add_argument("--ages", nargs="*", default=["abridged", "single"])
    asked.add_argument("--truths", nargs="*", default=TRUTHS)
    asked.add_argument("--indicators", nargs="*", default=["mode"])
    asked.add_argument("--settings", nargs="*", default=["almanac-1"])
    choice = asked.parse_args()
    for key in choice.settings:
        for ages in choice.ages:
            for persons in choice.sizes:
                for name in choice.truths:
                    for held in measure(
                        choice.indicators, SETTINGS[key], name, ages, persons, choice.replicates
                    ):
                        print(held, flush=True)


if __name__ == "__main__":
    main()
