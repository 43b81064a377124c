"""A reference table of remaining years turned into the death rates that give it."""

from functools import cache

import numpy as np

from engine.ages import AgeGrid, Array
from engine.chain import run
from engine.panel import Panel
from engine.settings import Settings
from engine.standards.remaining_years import RemainingYears

PEOPLE = 1e10  # person-years for each year of life: so many that no chance is left
OPEN_AGE = 100  # the ages above are one group
ROUNDING = 0.005  # of a year printed with two decimals
STEPS = 60  # of the iteration; a dozen settle


@cache
def reference_panel(of: RemainingYears, settings: Settings) -> Panel:
    """The stationary population under the death rates that give the printed years under settings.

    A life table has e(x) = a q + (1 - q) (n + e(x + n)), so that q = (n + e(x + n) - e(x)) / (n +
    e(x + n) - a), and m = q / (n - (n - a) q); the open group has m = 1 / e. What a is follows
    from the rates by the rules of the settings, so the two are found in turn until they agree; the
    table of the panel then has the printed years at every age. (With a fitted law on top, or a
    smooth curve, it has them nearly.) Its people are those of the stationary population, so many
    that chance plays no part.

    Shape:   panel [age], both sexes, open at 100.
    Missing: births are nan.
    Source:  Preston, Heuveline & Guillot (2001), Demography, ch. 3 (the columns of a table).
    """
    grid = AgeGrid(tuple(age for age in of.ages if age <= OPEN_AGE))
    years = np.array(of.years[: len(grid)])
    ax = np.append(grid.widths[:-1] / 2, years[-1])
    for _ in range(STEPS):
        panel = _stationary(grid, years, ax)
        found = run(panel, settings).table.ax[: len(grid) - 1]
        if np.allclose(found, ax[:-1], rtol=0, atol=1e-12):
            break
        ax = np.append(found, years[-1])
    return panel


def _stationary(grid: AgeGrid, years: Array, ax: Array) -> Panel:
    n, a, after = grid.widths[:-1], ax[:-1], years[1:]
    qx = (n + after - years[:-1]) / (n + after - a)
    lx = np.concatenate([[1.0], np.cumprod(1 - qx)])
    dx = np.append(lx[:-1] * qx, lx[-1])
    lived = np.append(n * lx[1:] + a * dx[:-1], lx[-1] * years[-1])
    return Panel.of(grid, PEOPLE * dx, PEOPLE * lived, sex="p")


def rounding(of: RemainingYears) -> Array:
    """By which share the rate of each group may be out because the years are printed rounded:
    twice the rounding over what the group takes off, [age] of the panel; 0 in the open group.

    The years fall by a few hundredths from group to group where hardly anybody dies, so that rates
    at 5 to 14 may be half as high or half as low; their part in life expectancy is as small.
    """
    grid = AgeGrid(tuple(age for age in of.ages if age <= OPEN_AGE))
    years = np.array(of.years[: len(grid)])
    taken = grid.widths[:-1] + years[1:] - years[:-1]
    return np.append(2 * ROUNDING / taken, 0.0)
