"""Ratios of the engine's ways of working, measured side by side in one run.

    OPENBLAS_NUM_THREADS=1 python -m tests.benchmarks.engine

Sides of a ratio take turns; medians are compared. Nothing is asserted: machines differ.
"""

import statistics
import time
from collections.abc import Callable

import numpy as np

from engine.chain import run
from engine.indicators import INDICATORS, estimate
from engine.panel import Panel
from engine.settings import SETTINGS
from engine.simulation import drawn
from engine.streams import poisson_draws
from tests.factories import GRIDS, codes, gompertz_panel

PLAIN = SETTINGS["almanac-1"]
E0, MODE = INDICATORS["e0"], INDICATORS["mode"]


def populations(grid: str, count: int) -> Panel:
    slopes = np.linspace(0.085, 0.11, count)
    level = 0.1 / np.exp(86 * slopes)
    return gompertz_panel(GRIDS[grid], seed=1, slope=slopes, level=level, people=2e6)


def side_by_side(*sides: Callable[[], object], turns: int = 7) -> list[float]:
    """Median seconds of each, taking turns."""
    seconds: list[list[float]] = [[] for _ in sides]
    for _ in range(turns):
        for side, spent in zip(sides, seconds, strict=True):
            start = time.perf_counter()
            side()
            spent.append(time.perf_counter() - start)
    return [statistics.median(spent) for spent in seconds]


def report(name: str, slow: tuple[str, float], fast: tuple[str, float]) -> None:
    print(
        f"{name}: {slow[0]} {1e3 * slow[1]:.1f} ms, {fast[0]} {1e3 * fast[1]:.2f} ms, "
        f"ratio {slow[1] / fast[1]:.1f}"
    )


def listed_e0(widths: list[float], deaths: list[float], years: list[float]) -> float:
    """e0 of one population in plain Python, with half the width for ax everywhere."""
    reach, lived = 1.0, 0.0
    for n, d, e in zip(widths[:-1], deaths[:-1], years[:-1], strict=True):
        q = n * (d / e) / (1 + n / 2 * (d / e))
        lived += n * reach * (1 - q / 2)
        reach *= 1 - q
    return lived + reach * years[-1] / deaths[-1]


def tables(grid: str) -> None:
    panel = populations(grid, 1000)
    widths = panel.grid.widths.tolist()
    rows = list(zip(panel.deaths.tolist(), panel.exposure.tolist(), strict=True))
    each, lists, batch = side_by_side(
        lambda: [run(panel[i], PLAIN) for i in range(100)],
        lambda: [listed_e0(widths, deaths, years) for deaths, years in rows],
        lambda: run(panel, PLAIN),
    )
    report(f"1000 tables, {grid} ages", ("one by one", 10 * each), ("as a batch", batch))
    report("  e0 alone in plain Python lists", ("lists", lists), ("whole batch", batch))


def intervals(grid: str) -> None:
    panel, chance = populations(grid, 40), codes(populations(grid, 40))

    def simulated() -> object:
        deaths = poisson_draws(panel.deaths, chance, PLAIN.draws, "benchmark")
        return np.quantile(drawn([E0], panel, deaths, PLAIN)["e0"], [0.025, 0.975], axis=0)

    slow, fast = side_by_side(simulated, lambda: estimate(E0, panel, PLAIN))
    report(f"interval of e0, 40 populations, {grid} ages", ("400 draws", slow), ("delta", fast))


def modes(grid: str) -> None:
    one, many = populations(grid, 1), populations(grid, 50)
    single, series, without = side_by_side(
        lambda: estimate(MODE, one, PLAIN, streams=codes(one)),
        lambda: estimate(MODE, many, PLAIN, streams=codes(many)),
        lambda: estimate(MODE, many, PLAIN),
        turns=3,
    )
    print(
        f"smooth mode, {grid} ages: 1 population with 400 draws {single:.3f} s; 50 with 400 draws "
        f"{series:.2f} s, without draws {without:.3f} s, ratio {series / without:.0f}"
    )


def main() -> None:
    for grid in ("abridged", "single"):
        tables(grid)
        intervals(grid)
        modes(grid)


if __name__ == "__main__":
    main()
