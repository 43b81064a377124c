"""Life tables of many populations and eight numbers read off each.

A tile of rows is worked on while it is in the cache. Elementwise steps run over it as one row of
cells; those that carry something from age to age run over four rows at once, since each step of one
row waits for the one before it.
"""

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from engine.compiled.jit import compiled, summing
from engine.compiled.rules import Rules, by_infant_rate
from engine.tables import Columns

Places = NDArray[np.intp]

NUMBERS = ("e0", "e65", "median", "mode_raw", "edagger", "H", "gini", "sd0")
TILE = 7168  # cells of a column: those of a tile fill half of a cache of one megabyte
FOUR = 4  # rows that are carried from age to age at once, as the steps below are written out


def tables(
    rules: Rules, deaths: Array, exposure: Array, weight: Array, ratio: Array
) -> tuple[Columns, Array]:
    """Columns [row, age] and NUMBERS [row, number] of deaths, exposure [row, age] and infants' mix
    weight, ratio [row, 2]."""
    found = Columns(*(np.empty(deaths.shape) for _ in Columns._fields))
    numbers = np.empty((len(deaths), len(NUMBERS)))
    fill(rules, deaths, exposure, weight, ratio, found, numbers)
    return found, numbers


def fill(
    rules: Rules,
    deaths: Array,
    exposure: Array,
    weight: Array,
    ratio: Array,
    found: Columns,
    numbers: Array,
) -> None:
    """The same into columns and numbers that are there already."""
    each = max(TILE // deaths.shape[1] // FOUR, 1) * FOUR
    n, adult = (np.tile(part, each) for part in (rules.widths, rules.adult_widths))
    density, most = np.empty((each, deaths.shape[1])), np.empty(each, np.intp)
    _fill(rules, n, adult, deaths, exposure, weight, ratio, density, most, found, numbers)


@compiled
def _fill(
    rules: Rules,
    n: Array,
    adult: Array,
    deaths: Array,
    exposure: Array,
    weight: Array,
    ratio: Array,
    density: Array,
    most: Places,
    found: Columns,
    numbers: Array,
) -> None:
    for first in range(0, deaths.shape[0], most.size):
        rows = slice(first, min(first + most.size, deaths.shape[0]))
        tile = _tile(found, rows)
        count, read = tile.mx.shape[0], numbers[rows]
        if _divide(deaths[rows].ravel(), exposure[rows].ravel(), tile.mx.ravel()) > 0:
            _join(deaths[rows], exposure[rows], tile.mx)
        _die(n, tile.mx.ravel(), tile.ax.ravel(), tile.qx.ravel())
        _die_early(rules, weight[rows], ratio[rows], tile.mx, tile.ax, tile.qx)
        _close(tile.mx, tile.ax, tile.qx)
        _survive(tile.qx, tile.lx)
        _live(
            n,
            adult,
            tile.ax.ravel(),
            tile.qx.ravel(),
            tile.lx.ravel(),
            tile.dx.ravel(),
            tile.Lx.ravel(),
            tile.ex.ravel(),
            density[:count].ravel(),
        )
        _add_up(tile.Lx, tile.Tx)
        _expect(tile.qx, tile.ex)
        _highest(density[:count], most)
        _expectancies(rules, tile.ex, read)
        _medians(rules, tile.lx, read)
        _modes(rules, tile.dx, most, read)
        _spreads(rules, tile.ax, tile.lx, tile.dx, tile.ex, read)


@compiled
def _tile(found: Columns, rows: slice) -> Columns:
    return Columns(
        found.mx[rows],
        found.ax[rows],
        found.qx[rows],
        found.lx[rows],
        found.dx[rows],
        found.Lx[rows],
        found.Tx[rows],
        found.ex[rows],
    )


@compiled
def _divide(deaths: Array, exposure: Array, mx: Array) -> int:
    """Also how many groups have no person-years."""
    empty = 0
    for i in range(mx.size):
        mx[i] = deaths[i] / exposure[i]
        empty += exposure[i] == 0
    return empty


@compiled
def _join(deaths: Array, exposure: Array, mx: Array) -> None:
    """Groups without person-years take the rate of the join with the group below."""
    for r in range(mx.shape[0]):
        joined = 0.0
        for x in range(mx.shape[1] - 1, -1, -1):
            joined += deaths[r, x]
            if exposure[r, x] == 0:
                mx[r, x] = np.nan
            else:
                mx[r, x] = joined / exposure[r, x]
                joined = 0.0
        for x in range(1, mx.shape[1]):
            if exposure[r, x] == 0:
                mx[r, x] = mx[r, x - 1]


@compiled
def _bounded(n: float, m: float, a: float) -> tuple[float, float]:
    """ax and qx; where more would die than enter, all die, after 1 / m years on average."""
    a = 1 / m if a * m > 1 else a
    q = n * m / (1 + (n - a) * m)
    return a, 1.0 if q > 1 else q


@compiled
def _die(n: Array, mx: Array, ax: Array, qx: Array) -> None:
    for i in range(mx.size):
        ax[i], qx[i] = _bounded(n[i], mx[i], n[i] / 2)


@compiled
def _die_early(rules: Rules, weight: Array, ratio: Array, mx: Array, ax: Array, qx: Array) -> None:
    """The first two groups, where a rule by the infant rate is for them."""
    for group, pieces in ((0, rules.first), (1, rules.child)):
        for r in range(mx.shape[0] if pieces.shape[1] else 0):
            w, times = weight[r], ratio[r]
            early = by_infant_rate(pieces, mx[r, 0], w[0], w[1], times[0], times[1])[0]
            ax[r, group], qx[r, group] = _bounded(rules.widths[group], mx[r, group], early)


@compiled
def _close(mx: Array, ax: Array, qx: Array) -> None:
    last = mx.shape[1] - 1
    for r in range(mx.shape[0]):
        ax[r, last] = np.nan if mx[r, last] == 0 else 1 / mx[r, last]
        qx[r, last] = 1.0


@compiled
def _four(first: int, rows: int) -> tuple[int, int, int, int]:
    """Rows to work on at once; where they end, the last one over again."""
    last = rows - 1
    return first, min(first + 1, last), min(first + 2, last), min(first + 3, last)


@compiled
def _survive(qx: Array, lx: Array) -> None:
    for first in range(0, qx.shape[0], FOUR):
        i, j, k, m = _four(first, qx.shape[0])
        a, b, c, d = 1.0, 1.0, 1.0, 1.0
        for x in range(qx.shape[1]):
            lx[i, x], lx[j, x], lx[k, x], lx[m, x] = a, b, c, d
            a *= 1 - qx[i, x]
            b *= 1 - qx[j, x]
            c *= 1 - qx[k, x]
            d *= 1 - qx[m, x]


@compiled
def _live(
    n: Array,
    adult: Array,
    ax: Array,
    qx: Array,
    lx: Array,
    dx: Array,
    Lx: Array,
    ex: Array,
    density: Array,
) -> None:
    """Deaths, also a year of age, and years lived, also by one who enters the group (in ex)."""
    for i in range(dx.size):
        dx[i] = lx[i] * qx[i]
        Lx[i] = n[i] * (lx[i] * (1 - qx[i])) + ax[i] * (lx[i] * qx[i])
        ex[i] = ax[i] * qx[i] + (1 - qx[i]) * n[i]
        density[i] = lx[i] * qx[i] / adult[i]


@compiled
def _add_up(Lx: Array, Tx: Array) -> None:
    for first in range(0, Lx.shape[0], FOUR):
        i, j, k, m = _four(first, Lx.shape[0])
        a, b, c, d = 0.0, 0.0, 0.0, 0.0
        for x in range(Lx.shape[1] - 1, -1, -1):
            a += Lx[i, x]
            b += Lx[j, x]
            c += Lx[k, x]
            d += Lx[m, x]
            Tx[i, x], Tx[j, x], Tx[k, x], Tx[m, x] = a, b, c, d


@compiled
def _expect(qx: Array, ex: Array) -> None:
    """From the years lived inside each group to those that are left, from the top down."""
    top = qx.shape[1] - 1
    for first in range(0, qx.shape[0], FOUR):
        i, j, k, m = _four(first, qx.shape[0])
        a, b, c, d = ex[i, top], ex[j, top], ex[k, top], ex[m, top]
        for x in range(top - 1, -1, -1):
            a = ex[i, x] + (1 - qx[i, x]) * a
            b = ex[j, x] + (1 - qx[j, x]) * b
            c = ex[k, x] + (1 - qx[k, x]) * c
            d = ex[m, x] + (1 - qx[m, x]) * d
            ex[i, x], ex[j, x], ex[k, x], ex[m, x] = a, b, c, d


@compiled
def _expectancies(rules: Rules, ex: Array, numbers: Array) -> None:
    for r in range(ex.shape[0]):
        numbers[r, 0] = ex[r, 0]
        numbers[r, 1] = np.nan if rules.at_65 < 0 else ex[r, rules.at_65]


@compiled
def _medians(rules: Rules, lx: Array, numbers: Array) -> None:
    for r in range(lx.shape[0]):
        group = 0
        for x in range(1, lx.shape[1]):
            group += lx[r, x] > 0.5
        numbers[r, 2] = np.nan
        if group < lx.shape[1] - 1:
            fallen = (lx[r, group] - 0.5) / (lx[r, group] - lx[r, group + 1])
            numbers[r, 2] = rules.starts[group] + rules.widths[group] * fallen


@compiled
def _modes(rules: Rules, dx: Array, most: Places, numbers: Array) -> None:
    """The adult age group with most deaths a year of age; nan where that is the last closed one."""
    last = dx.shape[1] - 2
    for r in range(dx.shape[0]):
        known = rules.adults > 2 and most[r] < last and not np.isnan(dx[r, last])
        numbers[r, 3] = rules.starts[most[r]] if known else np.nan


@summing
def _spreads(rules: Rules, ax: Array, lx: Array, dx: Array, ex: Array, numbers: Array) -> None:
    """e-dagger, H, Gini coefficient and standard deviation of the age at death."""
    starts, n, per, top = rules.starts, rules.widths, rules.per_year, ax.shape[1] - 1
    for r in range(ax.shape[0]):
        lost, both, squares, mean = 0.0, 0.0, 0.0, ex[r, 0]
        for x in range(top):
            lost += dx[r, x] * (ex[r, x + 1] + (1 - ax[r, x] * per[x]) * (ex[r, x] - ex[r, x + 1]))
            both += lx[r, x] ** 2 * ax[r, x] + lx[r, x + 1] ** 2 * (n[x] - ax[r, x])
            squares += dx[r, x] * (starts[x] + ax[r, x] - mean) ** 2
        lost += dx[r, top] * ex[r, top]
        both += lx[r, top] ** 2 * ax[r, top] / 2
        squares += dx[r, top] * ((starts[top] + ax[r, top] - mean) ** 2 + ax[r, top] ** 2)
        numbers[r, 4] = lost
        numbers[r, 5] = lost / mean
        numbers[r, 6] = 1 - both / mean
        numbers[r, 7] = np.sqrt(squares)


@compiled
def _highest(density: Array, at: Places) -> None:
    """The first position of the greatest of each row."""
    for first in range(0, density.shape[0], FOUR):
        i, j, k, m = _four(first, density.shape[0])
        a, b, c, d = -1.0, -1.0, -1.0, -1.0
        at[i], at[j], at[k], at[m] = 0, 0, 0, 0
        for x in range(density.shape[1]):
            if density[i, x] > a:
                a, at[i] = density[i, x], x
            if density[j, x] > b:
                b, at[j] = density[j, x], x
            if density[k, x] > c:
                c, at[k] = density[k, x], x
            if density[m, x] > d:
                d, at[m] = density[m, x], x
