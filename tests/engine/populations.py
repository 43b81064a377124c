"""Populations of mortality laws, for the tests of the engine."""

import numpy as np

from engine.ages import AgeGrid, Array
from engine.panel import Panel

SINGLE = AgeGrid(tuple(range(101)))
ABRIDGED = AgeGrid((0, 1, *range(5, 105, 5)))
IRREGULAR = AgeGrid((0, 1, 5, 10, 20, 40, 65, 70, 73, 75, 80, 84, 85, 90))
GRIDS = {"single": SINGLE, "abridged": ABRIDGED, "irregular": IRREGULAR}
MIXES = {
    "f": ((1.0, 0.0), (1.0, 1.0)),
    "m": ((0.0, 1.0), (1.0, 1.0)),
    "p": ((0.45, 0.55), (0.9, 1.1)),
}


def mortality(
    grid: AgeGrid, *, infant: float = 0.004, level: float = 2.5e-5, slope: float = 0.095
) -> Array:
    """Death rates of a Gompertz-Makeham law with an infant rate of its own, [age]."""
    ages = np.append(grid.mids[:-1], grid.open_age + 3.0)
    mx = 1e-4 + level * np.exp(slope * ages)
    mx[0] = infant
    if grid.starts[1:3] == (1, 5):
        mx[1] = infant / 12
    return mx


def person_years(grid: AgeGrid, total: float = 1e6) -> Array:
    """Person-years that thin out with age, [age], `total` in all."""
    ages = np.append(grid.mids[:-1], grid.open_age + 3.0)
    widths = np.append(grid.widths[:-1], 5.0)
    share = widths * np.exp(-ages / 90 - np.maximum(ages - 65, 0) ** 2 / 400)
    return np.asarray(total * share / share.sum())


def population(
    grid: AgeGrid = ABRIDGED,
    *,
    sex: str = "f",
    batch: tuple[int, ...] = (),
    total: float = 1e6,
    seed: int = 1,
    infant: float = 0.004,
    level: float = 2.5e-5,
    scatter: float = 0.05,
) -> Panel:
    """A panel whose rates scatter about a law, with deaths that need not be whole numbers."""
    rng = np.random.default_rng(seed)
    shape = (*batch, len(grid))
    mx = mortality(grid, infant=infant, level=level) * np.exp(rng.normal(0, scatter, shape))
    exposure = np.broadcast_to(person_years(grid, total), shape).copy()
    weight, ratio = (np.broadcast_to(part, (*batch, 2)).copy() for part in MIXES[sex])
    return Panel(grid, mx * exposure, exposure, weight, ratio)
