"""Tables of ordinary populations by numpy, each step into arrays kept for it.

For whole collections: what `engine.chain.run` and the indicators give, where no join or gap asks
for more than plain arithmetic. A population is one row of memory and each step runs over a block of
rows that stays in the cache, as one long line of cells where it can; what is a number a row is
worked out before and after, for all rows at once. The rows that are not ordinary are marked and
left to the chain. Whether one is depends on nothing but the row.
"""

from dataclasses import dataclass, replace

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
from engine.tables import Columns

Flags = NDArray[np.bool_]
Places = NDArray[np.intp]

COLUMNS = Columns._fields
CELLS = 24_576  # of a column in a block
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
    """What is the same for every row, and room for a block. Widths are [row, age] or, where all
    closed groups are as wide, one number, which is read the fastest; those of the open group count
    for nothing."""

    starts: Array  # [age]
    widths: Array  # [age]
    adult: slice  # groups that count for the mode
    n: Array
    before: Array  # of the group before
    first: Array  # [row, age]; room for what is worked out and used at once
    inside: Array  # [row, age]; years that those who die in a group live in it
    flags: Flags  # [row, age]; room

    @classmethod
    def of(cls, grid: AgeGrid, rows: int) -> "Rows":
        n, shape = np.append(grid.widths[:-1], grid.widths[-2]), (rows, len(grid))
        n, before = (
            one[None, :1] if np.all(n == n[0]) else np.tile(one, (rows, 1))
            for one in (n, np.roll(n, 1))
        )
        same = np.array(grid.starts, float), grid.widths, adult_groups(grid), n, before
        return cls(*same, np.empty(shape), np.empty(shape), np.empty(shape, bool))

    def some(self, rows: int) -> "Rows":
        """The same for so many rows."""
        return replace(
            self,
            n=self.n[:rows],
            before=self.before[:rows],
            first=self.first[:rows],
            inside=self.inside[:rows],
            flags=self.flags[:rows],
        )


def fill(
    panel: Panel, settings: Settings, columns: dict[str, Array], numbers: dict[str, Array]
) -> Flags:
    """Tables of populations in a row into columns [row, age] and what is read off them into numbers
    [row]; which rows are ordinary, [row]. The others hold nothing of use."""
    rows, ages = panel.deaths.shape
    size = max(1, min(CELLS // ages, rows))
    room, places = Rows.of(panel.grid, size), np.zeros((2, rows), np.intp)
    with np.errstate(all="ignore"):
        separation = _separation(panel, early_rules(panel.grid, settings))
        for first in range(0, rows, size):
            where = slice(first, min(first + size, rows))
            block = Columns(*(columns[name][where] for name in COLUMNS))
            some = room.some(len(block.mx))
            np.divide(panel.deaths[where], panel.exposure[where], out=block.mx)
            _die(some, {group: ax[where] for group, ax in separation.items()}, block)
            _live(some, block)
            _sums(some, block, {key: numbers[key][where] for key in numbers})
            _places(some, block, places[:, where])
        _beyond_the_last(panel.grid, columns, numbers)
        _numbers(panel.grid, room, columns, places, numbers)
        return np.asarray(np.isfinite(columns["lx"][:, -1]) & np.isfinite(columns["mx"][:, -1]))


def _separation(panel: Panel, rules: list[tuple[Pieces, Pieces]]) -> dict[int, Array]:
    """ax of the first groups and of the open one, which have rules of their own: [row] by group."""
    m0, last, found = _rate(panel, 0), _rate(panel, -1), {}
    for group, rule in enumerate(rules):
        m = _rate(panel, group)
        a = by_infant_rate(rule, m0, panel.infant_weight, panel.infant_ratio).ax
        found[group] = np.where(a * m > 1, 1 / m, a)  # no more can die than enter
    found[len(panel.grid) - 1] = np.where(last == 0, np.nan, 1 / last)  # nobody died: not known
    return found


def _rate(panel: Panel, group: int) -> Array:
    return np.asarray(panel.deaths[:, group] / panel.exposure[:, group])


def _die(rows: Rows, separation: dict[int, Array], block: Columns) -> None:
    """ax and qx = n m / (1 + (n - a) m)."""
    mx, ax, qx, after, widths = block.mx, block.ax, block.qx, rows.first, rows.widths
    ax[:] = rows.n / 2
    np.multiply(mx, rows.n / 2, out=after)
    full = np.flatnonzero(np.greater(after, 1, out=rows.flags))  # more would die than enter
    m, n = mx.ravel()[full], widths[full % len(widths)]
    ax.ravel()[full] = 1 / m
    after.ravel()[full] = (n - 1 / m) * m
    for group, a in separation.items():
        ax[:, group] = a
        after[:, group] = (widths[group] - a) * mx[:, group]
    after += 1
    np.multiply(mx, rows.n, out=qx)
    qx /= after
    qx.ravel()[full] = np.minimum(qx.ravel()[full], 1)
    for group in separation:
        qx[:, group] = np.minimum(qx[:, group], 1)
    qx[:, -1] = 1.0


def _live(rows: Rows, block: Columns) -> None:
    """From lx to ex. A step that reads the group beside reads on into the next row; what it makes
    of that is written over, or nothing."""
    lx, dx, Lx, px = block.lx, block.dx, block.Lx, rows.first
    np.subtract(1, block.qx.ravel()[:-1], out=px.ravel()[1:])  # of the group before
    px[:, 0] = 1.0
    np.multiply.accumulate(px, axis=1, out=lx)
    np.multiply(lx, block.qx, out=dx)
    np.multiply(block.ax, dx, out=rows.inside)
    through = np.multiply(lx, rows.before, out=rows.first)  # years in the group before
    through[:, 0] = 0.0
    np.add(rows.inside.ravel()[:-1], through.ravel()[1:], out=Lx.ravel()[:-1])
    Lx[-1, -1] = rows.inside[-1, -1]
    np.add.accumulate(Lx[:, ::-1], axis=1, out=block.Tx[:, ::-1])
    np.divide(block.Tx, np.maximum(lx, LEAST, out=rows.first), out=block.ex)


def _sums(rows: Rows, block: Columns, numbers: dict[str, Array]) -> None:
    """With v the years that those who die in a group live in it: of e-dagger, d e less (v / n)
    (e(x) - e(x+n)); of gini the years that two of one table are both alive, l v + l(x+n) L, and
    half of l v in the open group; of sd0 the variance, d (x + a - e0)^2, and v a more where lives
    in the open group are unlike."""
    ax, lx, dx, ex, inside = block.ax, block.lx, block.dx, block.ex, rows.inside
    lost, both, squares = (numbers[key] for key in ("edagger", "gini", "sd0"))
    share = np.divide(inside, rows.n, out=rows.first)
    share[:, -1] = 0.0
    np.vecdot(dx, ex, out=lost)
    lost -= np.vecdot(share, ex)
    lost += np.vecdot(share[:, :-1], ex[:, 1:])
    np.vecdot(inside, lx, out=both)
    both += np.vecdot(block.Lx[:, :-1], lx[:, 1:])
    both -= inside[:, -1] * lx[:, -1] / 2
    away = np.add(ax, rows.starts, out=rows.first)
    away -= ex[:, :1]
    away *= away
    np.vecdot(dx, away, out=squares)
    squares += inside[:, -1] * ax[:, -1]


def _places(rows: Rows, block: Columns, places: Places) -> None:
    """The first group that no more than half reach, 0 where more reach each; and which adult group
    has most deaths a year."""
    np.argmax(np.less_equal(block.lx, 0.5, out=rows.flags), axis=1, out=places[0])
    density = block.dx if rows.n.size == 1 else np.divide(block.dx, rows.n, out=rows.first)
    if rows.adult.start < rows.adult.stop:
        np.argmax(density[:, rows.adult], axis=1, out=places[1])


def _beyond_the_last(grid: AgeGrid, columns: dict[str, Array], numbers: dict[str, Array]) -> None:
    """ex at ages that next to nobody in the table reaches, from the top: the years lived in the
    group and those left after it; and e-dagger, which rests on the lowest of them."""
    ax, qx, lx, dx, ex = (columns[name] for name in ("ax", "qx", "lx", "dx", "ex"))
    few, x = np.flatnonzero(lx[:, -1] < LEAST), len(grid) - 1
    beyond, left = lx[few, x] < LEAST, ax[few, x]
    while beyond.any():
        missed = np.where(beyond, left - ex[few, x], 0.0)
        ex[few, x] += missed
        x -= 1
        a, q, n = ax[few, x], qx[few, x], grid.widths[x]
        numbers["edagger"][few] += dx[few, x] * a / n * missed
        left = a * q + (1 - q) * n + (1 - q) * left
        beyond = lx[few, x] < LEAST


def _numbers(
    grid: AgeGrid, rows: Rows, columns: dict[str, Array], places: Places, numbers: dict[str, Array]
) -> None:
    """From sums and places to the numbers; the median is nan in the open group, the mode in the
    last closed one."""
    lx, ex, starts, adult = columns["lx"], columns["ex"], rows.starts, rows.adult
    e0, below, mode = ex[:, 0], places[0], adult.start + places[1]
    numbers["e0"][:] = e0
    numbers["e65"][:] = ex[:, grid.position(65)] if grid.has(65) else np.nan
    numbers["H"][:] = numbers["edagger"] / e0
    numbers["gini"][:] = 1 - numbers["gini"] / e0
    numbers["sd0"][:] = np.sqrt(numbers["sd0"])
    at, after = (lx[np.arange(len(lx)), group] for group in (below - 1, below))
    inside = starts[below - 1] + rows.widths[below - 1] * ((at - 0.5) / (at - after))
    numbers["median"][:] = np.where(below > 0, inside, np.nan)
    known = (mode < adult.stop - 1) & (adult.stop - adult.start > 2)
    numbers["mode_raw"][:] = np.where(known, starts[mode], np.nan)
