"""Tables and differences of ordinary populations by numpy, each step into arrays kept for it.

For whole collections: what `engine.chain.run` and `engine.decomposition.contributions` give, where
no join, bound or gap asks for more than plain arithmetic. A population is one row of memory and
each step runs over a block of rows that stays in the cache; the rest is marked and left to the
chain. Whether a row is ordinary depends on nothing but the row.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.ages import AgeGrid, Array
from engine.panel import Panel
from engine.settings import Settings
from engine.stages.separation import (
    CHILD,
    CONSTANT_RATE,
    FIRST_YEAR,
    Pieces,
    by_infant_rate,
    has_child_group,
    has_first_year,
)
from engine.stages.smoothing import adult_groups

Flags = NDArray[np.bool_]

COLUMNS = ("mx", "ax", "qx", "lx", "dx", "Lx", "Tx", "ex")
BELOW_ONE = 1 - 1e-12  # a qx under this is not bound
LEAST = 1e-200  # a share of births by which what is summed above it is divided without loss


def followed(settings: Settings) -> bool:
    """Whether tables under these settings are made by the arithmetic of this file: closed by 1 / m,
    half the width inside groups, the first years by the infant rate."""
    return (
        settings.open_interval == "one_over_m"
        and settings.smoothing == "none"
        and settings.inside == "midpoint"
        and not settings.borrow
        and FIRST_YEAR[settings.first_year] is not CONSTANT_RATE
        and CHILD[settings.child] is not CONSTANT_RATE
    )


def early_rules(grid: AgeGrid, settings: Settings) -> list[tuple[Pieces, Pieces]]:
    """The rules by the infant rate, of the first group and, where it is ages 1 to 4, the second."""
    rules = [FIRST_YEAR[settings.first_year]] if has_first_year(grid) else []
    return rules + ([CHILD[settings.child]] if has_child_group(grid) else [])


@dataclass(frozen=True, slots=True)
class Rows:
    """What is the same for every row, and room for a block: [row, age] or [row, closed group]."""

    grid: AgeGrid
    rules: list[tuple[Pieces, Pieces]]
    n: Array  # closed groups
    half: Array
    first: Array  # [row, closed group]; room for what is worked out and used at once
    second: Array
    ages: Array  # ages at death of each group, [row, age]

    @classmethod
    def of(cls, grid: AgeGrid, settings: Settings, rows: int) -> "Rows":
        closed = np.tile(grid.widths[:-1], (rows, 1))
        first, second = np.empty_like(closed), np.empty_like(closed)
        ages = np.empty((rows, len(grid)))
        return cls(grid, early_rules(grid, settings), closed, closed / 2, first, second, ages)


def fill(panel: Panel, rows: Rows, columns: dict[str, Array], numbers: dict[str, Array]) -> Flags:
    """Tables of a block into columns [row, age] and what is read off them into numbers [row]; which
    rows are ordinary, [row]. The others hold nothing of use."""
    with np.errstate(all="ignore"):
        np.divide(panel.deaths, panel.exposure, out=columns["mx"])
        ordinary = _columns(panel, rows, columns)
        _numbers(rows, columns, numbers)
    return ordinary


def _columns(panel: Panel, rows: Rows, columns: dict[str, Array]) -> Flags:
    mx, ax, qx, lx, dx, Lx, Tx, ex = (columns[name] for name in COLUMNS)
    count = len(mx)
    n, t, p = rows.n[:count], rows.first[:count], rows.second[:count]
    m, a, q = mx[:, :-1], ax[:, :-1], qx[:, :-1]
    a[:] = rows.half[:count]
    for k, rule in enumerate(rows.rules):
        a[:, k] = by_infant_rate(rule, mx[:, 0], panel.infant_weight, panel.infant_ratio).ax
    ax[:, -1] = np.where(mx[:, -1] == 0, np.nan, 1 / mx[:, -1])  # nobody died, nothing is known
    np.multiply(a, m, out=t)
    full = np.nonzero(t > 1)
    a[full] = 1 / m[full]  # no more can die than enter
    np.subtract(n, a, out=t)
    t *= m
    t += 1
    np.multiply(n, m, out=q)
    q /= t
    q[full] = np.minimum(q[full], 1)
    qx[:, -1] = 1.0
    lx[:, 0] = 1.0
    np.subtract(1, q, out=p)
    np.multiply.accumulate(p, axis=1, out=lx[:, 1:])
    np.multiply(lx, qx, out=dx)
    np.multiply(n, lx[:, 1:], out=t)
    np.multiply(ax, dx, out=Lx)
    Lx[:, :-1] += t
    np.add.accumulate(Lx[:, ::-1], axis=1, out=Tx[:, ::-1])
    np.divide(Tx, lx, out=ex)
    _beyond_the_last(rows, columns)
    return np.asarray(np.isfinite(mx.sum(axis=1)))


def _beyond_the_last(rows: Rows, columns: dict[str, Array]) -> None:
    """ex at ages that next to nobody in the table reaches, from the top: the years lived in the
    group and those left after it."""
    ax, qx, lx, ex = (columns[name] for name in ("ax", "qx", "lx", "ex"))
    few = np.flatnonzero(lx[:, -1] < LEAST)
    if not len(few):
        return
    x = len(rows.grid) - 1
    beyond, left = lx[few, x] < LEAST, ax[few, x]
    while beyond.any():
        ex[few, x] = np.where(beyond, left, ex[few, x])
        x -= 1
        q = qx[few, x]
        left = ax[few, x] * q + (1 - q) * rows.n[0, x] + (1 - q) * left
        beyond = lx[few, x] < LEAST


def _numbers(rows: Rows, columns: dict[str, Array], numbers: dict[str, Array]) -> None:
    ax, lx, dx, ex = (columns[name] for name in ("ax", "lx", "dx", "ex"))
    e0, each = ex[:, 0], np.arange(len(ex))
    lost = _lost(rows, ax, dx, ex)
    numbers["e0"][:] = e0
    numbers["e65"][:] = ex[:, rows.grid.position(65)] if rows.grid.has(65) else np.nan
    numbers["median"][:] = _median(rows, lx, each)
    numbers["mode_raw"][:] = _mode(rows, dx)
    numbers["edagger"][:] = lost
    numbers["H"][:] = lost / e0
    numbers["gini"][:] = 1 - _both_alive(rows, ax, lx) / e0
    ages = rows.ages[: len(ex)]
    np.add(np.array(rows.grid.starts, float), ax, out=ages)
    ages -= e0[:, None]
    ages *= ages
    ages[:, -1] += ax[:, -1] ** 2
    ages *= dx
    numbers["sd0"][:] = np.sqrt(ages.sum(axis=1))


def _median(rows: Rows, lx: Array, each: NDArray[np.intp]) -> Array:
    """Where half are left, even between the ends of its group; nan in the open one."""
    last = lx.shape[1] - 1
    group = np.count_nonzero(lx[:, 1:] > 0.5, axis=1)
    inside = np.minimum(group, last - 1)
    at, after = lx[each, inside], lx[each, inside + 1]
    starts = np.array(rows.grid.starts, float)
    found = starts[inside] + rows.n[0, inside] * ((at - 0.5) / (at - after))
    return np.where(group < last, found, np.nan)


def _mode(rows: Rows, dx: Array) -> Array:
    """The adult group with most deaths a year of age; nan where it is the last closed one."""
    groups = adult_groups(rows.grid)
    starts, widths = np.array(rows.grid.starts, float)[groups], rows.n[0, groups]
    if len(starts) < 3:
        return np.full(len(dx), np.nan)
    deaths = dx[:, groups]
    top = np.argmax(deaths if np.all(widths == 1) else deaths / widths, axis=1)
    return np.where(top < len(starts) - 1, starts[top], np.nan)


def _lost(rows: Rows, ax: Array, dx: Array, ex: Array) -> Array:
    """e-dagger: d (e(x+n) + (1 - a/n) (e(x) - e(x+n))) summed, and d e of the open group."""
    count = len(ex)
    t, left = rows.first[:count], rows.second[:count]
    np.divide(ax[:, :-1], rows.n[:count], out=t)
    np.subtract(1, t, out=t)
    np.subtract(ex[:, :-1], ex[:, 1:], out=left)
    t *= left
    t += ex[:, 1:]
    t *= dx[:, :-1]
    return np.asarray(t.sum(axis=1) + dx[:, -1] * ex[:, -1])


def _both_alive(rows: Rows, ax: Array, lx: Array) -> Array:
    """Years that two of one table are both alive: l^2 a + l(x+n)^2 (n - a), half of it on top."""
    count = len(lx)
    n, t, gone, square = (part[:count] for part in (rows.n, rows.first, rows.second, rows.ages))
    np.multiply(lx, lx, out=square)
    np.subtract(n, ax[:, :-1], out=t)
    t *= square[:, 1:]
    np.multiply(square[:, :-1], ax[:, :-1], out=gone)
    t += gone
    return np.asarray(t.sum(axis=1) + square[:, -1] * ax[:, -1] / 2)
