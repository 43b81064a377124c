"""Life tables of many populations and eight numbers read off each, in one pass through memory.

Rows are worked on in tiles that stay in the cache and are written out together. Elementwise steps
run over a tile as one row of cells; those that carry something from age to age run over four rows
at once, since each step of one row waits for the one before it.
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from engine.compiled.jit import compiled, summing
from engine.compiled.rules import Rules, by_infant_rate

Places = NDArray[np.intp]

NUMBERS = ("e0", "e65", "median", "mode_raw", "edagger", "H", "gini", "sd0")
TILE = 7168  # cells of a column: eight columns fill half of a cache of one megabyte
FOUR = 4  # rows that are carried from age to age at once, as the steps below are written out


class Columns(NamedTuple):
    """The columns of tables: of the whole batch and of one tile, by row or as one row of cells."""

    mx: Array
    ax: Array
    qx: Array
    lx: Array
    dx: Array
    Lx: Array
    Tx: Array
    ex: Array


def tables(
    rules: Rules, deaths: Array, exposure: Array, weight: Array, ratio: Array
) -> tuple[Columns, Array]:
    """Columns [row, age] and NUMBERS [row, number] of deaths, exposure [row, age] and infants' mix
    weight, ratio [row, 2]."""
    rows, ages = deaths.shape
    each = min(TILE // ages // FOUR + 1, (rows + FOUR - 1) // FOUR) * FOUR
    found = Columns(*(np.empty((rows, ages)) for _ in Columns._fields))
    numbers = np.empty((rows, len(NUMBERS)))
    whole = rows // each * each
    given = (deaths, exposure, weight, ratio)
    if whole:
        _by_tiles(rules, each, given, found, numbers, slice(0, whole))
    if whole < rows:  # the rest fills a tile with copies of itself
        rest = slice(whole, rows)
        copies = tuple(np.resize(part[rest], (each, part.shape[1])) for part in given)
        tile = Columns(*(np.empty((each, ages)) for _ in Columns._fields))
        read = np.empty((each, len(NUMBERS)))
        _by_tiles(rules, each, copies, tile, read, slice(0, each))
        for column, part in zip(found, tile, strict=True):
            column[rest] = part[: rows - whole]
        numbers[rest] = read[: rows - whole]
    return found, numbers


def _by_tiles(
    rules: Rules,
    each: int,
    given: tuple[Array, ...],
    found: Columns,
    numbers: Array,
    where: slice,
) -> None:
    """Whole tiles of `each` rows."""
    tiles, ages = (where.stop - where.start) // each, len(rules.starts)
    tiled = (np.ascontiguousarray(one[where]).reshape(tiles, each, -1) for one in given)
    cells = Columns(*(np.ones(each * ages) for _ in Columns._fields))
    deaths, exposure, weight, ratio = tiled
    _fill(
        rules,
        np.tile(rules.widths, each),
        np.tile(rules.adult_widths, each),
        deaths,
        exposure,
        weight,
        ratio,
        cells,
        Columns(*(part.reshape(each, ages) for part in cells)),
        np.ones((each, ages)),
        np.zeros(each, np.intp),
        Columns(*(part[where].reshape(tiles, each * ages) for part in found)),
        numbers[where].reshape(tiles, each, len(NUMBERS)),
    )


@compiled
def _fill(
    rules: Rules,
    n: Array,
    adult: Array,
    deaths: Array,
    exposure: Array,
    weight: Array,
    ratio: Array,
    cells: Columns,
    by_row: Columns,
    density: Array,
    most: Places,
    found: Columns,
    numbers: Array,
) -> None:
    for t in range(deaths.shape[0]):
        if _divide(deaths, exposure, t, by_row.mx) > 0:
            _join(deaths, exposure, t, by_row.mx)
        _place(n, cells.mx, cells.ax)
        _by_rule(rules, weight, ratio, t, by_row.mx, by_row.ax)
        _die(n, cells.mx, cells.ax, cells.qx)
        _close(by_row.mx, by_row.ax, by_row.qx)
        _survive(by_row.qx, by_row.lx)
        _count(cells.lx, cells.qx, cells.dx)
        _live(n, cells.ax, cells.lx, cells.qx, cells.Lx)
        _add_up(by_row.Lx, by_row.Tx)
        _live_inside(n, cells.ax, cells.qx, cells.ex)
        _expect(by_row.qx, by_row.ex)
        _per_year(cells.dx, adult, density.ravel())
        _highest(density, most)
        _expectancies(rules, by_row.ex, numbers, t)
        _medians(rules, by_row.lx, numbers, t)
        _modes(rules, by_row.dx, most, numbers, t)
        _spreads(rules, by_row.ax, by_row.lx, by_row.dx, by_row.ex, numbers, t)
        _write(cells.mx, found.mx, t)
        _write(cells.ax, found.ax, t)
        _write(cells.qx, found.qx, t)
        _write(cells.lx, found.lx, t)
        _write(cells.dx, found.dx, t)
        _write(cells.Lx, found.Lx, t)
        _write(cells.Tx, found.Tx, t)
        _write(cells.ex, found.ex, t)


@compiled
def _divide(deaths: Array, exposure: Array, t: int, mx: Array) -> int:
    """Also how many groups have no person-years."""
    empty = 0
    for r in range(mx.shape[0]):
        for x in range(mx.shape[1]):
            mx[r, x] = deaths[t, r, x] / exposure[t, r, x]
        for x in range(mx.shape[1]):
            empty += exposure[t, r, x] == 0
    return empty


@compiled
def _join(deaths: Array, exposure: Array, t: int, mx: Array) -> None:
    """Groups without person-years take the rate of the join with the group below."""
    for r in range(mx.shape[0]):
        joined = 0.0
        for x in range(mx.shape[1] - 1, -1, -1):
            joined += deaths[t, r, x]
            if exposure[t, r, x] == 0:
                mx[r, x] = np.nan
            else:
                mx[r, x] = joined / exposure[t, r, x]
                joined = 0.0
        for x in range(1, mx.shape[1]):
            if exposure[t, r, x] == 0:
                mx[r, x] = mx[r, x - 1]


@compiled
def _place(n: Array, mx: Array, ax: Array) -> None:
    """Half the width; where more would die than enter, all die after 1 / m years on average."""
    for i in range(ax.size):
        ax[i] = 1 / mx[i] if n[i] / 2 * mx[i] > 1 else n[i] / 2


@compiled
def _by_rule(rules: Rules, weight: Array, ratio: Array, t: int, mx: Array, ax: Array) -> None:
    for r in range(mx.shape[0]):
        if rules.first.shape[1]:
            early = _mixed(rules.first, mx[r, 0], weight, ratio, t, r)
            ax[r, 0] = 1 / mx[r, 0] if early * mx[r, 0] > 1 else early
        if rules.child.shape[1]:
            early = _mixed(rules.child, mx[r, 0], weight, ratio, t, r)
            ax[r, 1] = 1 / mx[r, 1] if early * mx[r, 1] > 1 else early


@compiled
def _mixed(pieces: Array, m0: float, weight: Array, ratio: Array, t: int, r: int) -> float:
    w, times = weight[t, r], ratio[t, r]
    return by_infant_rate(pieces, m0, w[0], w[1], times[0], times[1])[0]


@compiled
def _die(n: Array, mx: Array, ax: Array, qx: Array) -> None:
    for i in range(qx.size):
        q = n[i] * mx[i] / (1 + (n[i] - ax[i]) * mx[i])
        qx[i] = 1.0 if q > 1 else q


@compiled
def _close(mx: Array, ax: Array, qx: Array) -> None:
    last = mx.shape[1] - 1
    for r in range(mx.shape[0]):
        ax[r, last] = np.nan if mx[r, last] == 0 else 1 / mx[r, last]
        qx[r, last] = 1.0


@compiled
def _survive(qx: Array, lx: Array) -> None:
    for r in range(0, qx.shape[0], 4):
        a, b, c, d = 1.0, 1.0, 1.0, 1.0
        for x in range(qx.shape[1]):
            lx[r, x], lx[r + 1, x], lx[r + 2, x], lx[r + 3, x] = a, b, c, d
            a *= 1 - qx[r, x]
            b *= 1 - qx[r + 1, x]
            c *= 1 - qx[r + 2, x]
            d *= 1 - qx[r + 3, x]


@compiled
def _count(lx: Array, qx: Array, dx: Array) -> None:
    for i in range(dx.size):
        dx[i] = lx[i] * qx[i]


@compiled
def _live(n: Array, ax: Array, lx: Array, qx: Array, Lx: Array) -> None:
    for i in range(Lx.size):
        Lx[i] = n[i] * (lx[i] * (1 - qx[i])) + ax[i] * (lx[i] * qx[i])


@compiled
def _add_up(Lx: Array, Tx: Array) -> None:
    for r in range(0, Lx.shape[0], 4):
        a, b, c, d = 0.0, 0.0, 0.0, 0.0
        for x in range(Lx.shape[1] - 1, -1, -1):
            a += Lx[r, x]
            b += Lx[r + 1, x]
            c += Lx[r + 2, x]
            d += Lx[r + 3, x]
            Tx[r, x], Tx[r + 1, x], Tx[r + 2, x], Tx[r + 3, x] = a, b, c, d


@compiled
def _live_inside(n: Array, ax: Array, qx: Array, ex: Array) -> None:
    for i in range(ex.size):
        ex[i] = ax[i] * qx[i] + (1 - qx[i]) * n[i]


@compiled
def _expect(qx: Array, ex: Array) -> None:
    """From the years lived inside each group to those that are left, from the top down."""
    top = qx.shape[1] - 1
    for r in range(0, qx.shape[0], 4):
        a, b, c, d = ex[r, top], ex[r + 1, top], ex[r + 2, top], ex[r + 3, top]
        for x in range(top - 1, -1, -1):
            a = ex[r, x] + (1 - qx[r, x]) * a
            b = ex[r + 1, x] + (1 - qx[r + 1, x]) * b
            c = ex[r + 2, x] + (1 - qx[r + 2, x]) * c
            d = ex[r + 3, x] + (1 - qx[r + 3, x]) * d
            ex[r, x], ex[r + 1, x], ex[r + 2, x], ex[r + 3, x] = a, b, c, d


@compiled
def _write(values: Array, to: Array, t: int) -> None:
    for i in range(values.size):
        to[t, i] = values[i]


@compiled
def _expectancies(rules: Rules, ex: Array, numbers: Array, t: int) -> None:
    for r in range(ex.shape[0]):
        numbers[t, r, 0] = ex[r, 0]
        numbers[t, r, 1] = np.nan if rules.at_65 < 0 else ex[r, rules.at_65]


@compiled
def _medians(rules: Rules, lx: Array, numbers: Array, t: int) -> None:
    for r in range(lx.shape[0]):
        group = 0
        for x in range(1, lx.shape[1]):
            group += lx[r, x] > 0.5
        numbers[t, r, 2] = np.nan
        if group < lx.shape[1] - 1:
            fallen = (lx[r, group] - 0.5) / (lx[r, group] - lx[r, group + 1])
            numbers[t, r, 2] = rules.starts[group] + rules.widths[group] * fallen


@compiled
def _modes(rules: Rules, dx: Array, most: Places, numbers: Array, t: int) -> None:
    """The adult age group with most deaths a year of age; nan where that is the last closed one."""
    last = dx.shape[1] - 2
    for r in range(dx.shape[0]):
        known = rules.adults > 2 and most[r] < last and not np.isnan(dx[r, last])
        numbers[t, r, 3] = rules.starts[most[r]] if known else np.nan


@summing
def _spreads(
    rules: Rules, ax: Array, lx: Array, dx: Array, ex: Array, numbers: Array, t: int
) -> None:
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
        numbers[t, r, 4] = lost
        numbers[t, r, 5] = lost / mean
        numbers[t, r, 6] = 1 - both / mean
        numbers[t, r, 7] = np.sqrt(squares)


@compiled
def _per_year(dx: Array, n: Array, density: Array) -> None:
    for i in range(dx.size):
        density[i] = dx[i] / n[i]


@compiled
def _highest(density: Array, at: Places) -> None:
    """The first position of the greatest of each row, four rows at once."""
    for r in range(0, density.shape[0], 4):
        a, b, c, d = -1.0, -1.0, -1.0, -1.0
        i, j, k, m = 0, 0, 0, 0
        for x in range(density.shape[1]):
            if density[r, x] > a:
                a, i = density[r, x], x
            if density[r + 1, x] > b:
                b, j = density[r + 1, x], x
            if density[r + 2, x] > c:
                c, k = density[r + 2, x], x
            if density[r + 3, x] > d:
                d, m = density[r + 3, x], x
        at[r], at[r + 1], at[r + 2], at[r + 3] = i, j, k, m
