"""The period life table, from rates, probabilities or survivors, and its adjoint.

The adjoint turns derivatives with respect to the table's columns into derivatives with respect to
mx and ax, so that an indicator states only how it reads the table.
"""

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from engine.ages import AgeGrid, Array

ROUNDING = 1e-9  # by so much a qx may pass 1 and still be 1


@dataclass(frozen=True, slots=True)
class LifeTable:
    """One table per population; every column is [..., age] on `grid`, radix 1.

    ex is built from the top, so it is defined even at ages that nobody in the table reaches.
    """

    grid: AgeGrid
    mx: Array
    ax: Array  # in the open group, the expectation of life at its start
    qx: Array  # 1 in the open group
    lx: Array
    dx: Array
    Lx: Array
    Tx: Array
    ex: Array


class Columns(NamedTuple):
    """The columns of many tables, written in place: of the whole batch or of one part of it, by row
    or as one row of cells."""

    mx: Array
    ax: Array
    qx: Array
    lx: Array
    dx: Array
    Lx: Array
    Tx: Array
    ex: Array


@dataclass(frozen=True, slots=True)
class Partials:
    """Derivatives of one number by the columns it reads, each [..., age]; None is 0."""

    mx: Array | None = None
    ax: Array | None = None
    lx: Array | None = None
    dx: Array | None = None
    Lx: Array | None = None
    ex: Array | None = None


@dataclass(frozen=True, slots=True)
class Gradient:
    """Derivatives of one number with respect to mx and ax, each [..., age]."""

    mx: Array
    ax: Array


def from_rates(grid: AgeGrid, mx: Array, ax: Array) -> LifeTable:
    """The table of given death rates, qx = n mx / (1 + (n - ax) mx).

    Shape:   mx, ax [..., age], broadcast; real or complex.
    Missing: nan in a cell leaves lx above it, and ex everywhere, nan. A rate so high that more die
             than enter (ax mx > 1, hence qx > 1) gives nan: such a pair of mx and ax has no table.
    Raises:  ValueError where the ages differ from the grid's.
    Source:  Preston, Heuveline & Guillot (2001), Demography, ch. 3.
    >>> from_rates(AgeGrid((0, 1)), np.array([0.5, 0.1]), np.array([0.5, 10.0])).ex
    array([ 6.8, 10. ])
    """
    mx, ax = np.broadcast_arrays(mx, ax)
    _require_ages(grid, mx=mx)
    with np.errstate(all="ignore"):
        qx = _probability(grid.widths[:-1], mx[..., :-1], ax[..., :-1])
        return _assemble(grid, mx, ax, qx)


def pull(table: LifeTable, partials: Partials) -> Gradient:
    """The gradient in mx and ax of a number whose derivatives by column are given.

    Shape:   partials and result [..., age] on the table's grid.
    Missing: an age or column that the number does not read (0 or None) passes no nan on.
    """
    with np.errstate(all="ignore"):
        return _pull(table, partials)


def _pull(table: LifeTable, partials: Partials) -> Gradient:
    n = table.grid.widths[:-1]
    m, a, q = table.mx[..., :-1], table.ax[..., :-1], table.qx[..., :-1]
    p, last = 1 - q, len(table.grid) - 1
    zero = np.zeros(np.broadcast_shapes(*(np.shape(g) for g in _given(partials)), table.mx.shape))
    zero = zero.astype(np.result_type(table.mx, *_given(partials)))
    gm, ga, gl, gd = (
        zero + (0.0 if g is None else g)
        for g in (partials.mx, partials.ax, partials.lx, partials.dx)
    )
    gq = zero[..., :-1].copy()
    if partials.ex is not None:  # e_x = a_x q_x + p_x (n + e_{x+n})
        reach = zero + partials.ex
        for x in range(last):
            ga[..., x] += _through(reach[..., x], q[..., x])
            gq[..., x] += _through(reach[..., x], a[..., x] - n[x] - table.ex[..., x + 1])
            reach[..., x + 1] += _through(reach[..., x], p[..., x])
        ga[..., -1] += reach[..., -1]
    if partials.Lx is not None:  # L_x = n l_{x+n} + a_x d_x, and l a in the open group
        gl[..., 1:] += n * partials.Lx[..., :-1]
        gd[..., :-1] += _through(partials.Lx[..., :-1], a)
        ga[..., :-1] += _through(partials.Lx[..., :-1], table.dx[..., :-1])
        gl[..., -1] += _through(partials.Lx[..., -1], table.ax[..., -1])
        ga[..., -1] += _through(partials.Lx[..., -1], table.lx[..., -1])
    gl[..., :-1] += _through(gd[..., :-1], q)  # d_x = l_x q_x, and l in the open group
    gl[..., -1] += gd[..., -1]
    gq += _through(gd[..., :-1], table.lx[..., :-1])
    for x in reversed(range(last)):  # l_{x+n} = l_x p_x, without dividing by a p_x that may be 0
        gq[..., x] -= _through(gl[..., x + 1], table.lx[..., x])
        gl[..., x] += _through(gl[..., x + 1], p[..., x])
    per_q = _through(gq, n / (1 + (n - a) * m) ** 2)
    gm[..., :-1] += per_q
    ga[..., :-1] += _through(per_q, m * m)
    return Gradient(gm, ga)


def _through(g: Array, slope: Array) -> Array:
    """g * slope; what does not move the number takes no nan from a column that has one."""
    return np.where(g == 0, 0.0, g * slope)


def _given(partials: Partials) -> list[Array]:
    columns = (getattr(partials, name) for name in Partials.__slots__)
    return [column for column in columns if column is not None]


def _probability(n: Array, m: Array, a: Array) -> Array:
    q = n * m / (1 + (n - a) * m)
    q = np.where(np.real(q) > 1 + ROUNDING, np.nan, q)
    return np.where(np.real(q) > 1, 1.0, q)


def _assemble(grid: AgeGrid, mx: Array, ax: Array, closed: Array) -> LifeTable:
    n, a = grid.widths[:-1], ax[..., :-1]
    one = np.ones_like(mx[..., :1])
    lx = np.concatenate([one, np.cumprod(1 - closed, axis=-1)], axis=-1)
    dx = np.concatenate([lx[..., :-1] * closed, lx[..., -1:]], axis=-1)
    person_years = n * lx[..., 1:] + a * dx[..., :-1]
    Lx = np.concatenate([person_years, lx[..., -1:] * ax[..., -1:]], axis=-1)
    Tx = np.flip(np.cumsum(np.flip(Lx, axis=-1), axis=-1), axis=-1)
    ex = _from_the_top(a * closed + (1 - closed) * n, 1 - closed, ax[..., -1:])
    qx = np.concatenate([closed, one], axis=-1)
    return LifeTable(grid, mx, ax, qx, lx, dx, Lx, Tx, ex)


def _from_the_top(lived: Array, px: Array, last: Array) -> Array:
    """e_x = lived + p_x e_{x+n}: `lived` the years inside a group of those who enter it."""
    # age first, so that each step runs along memory
    ex = np.ascontiguousarray(np.moveaxis(np.concatenate([lived, last], axis=-1), -1, 0))
    reach = np.ascontiguousarray(np.moveaxis(px, -1, 0))
    for x in reversed(range(len(reach))):
        ex[x] += reach[x] * ex[x + 1]
    return np.ascontiguousarray(np.moveaxis(ex, 0, -1))


def _require_ages(grid: AgeGrid, **columns: Array) -> None:
    for name, column in columns.items():
        if column.shape[-1] != len(grid):
            raise ValueError(
                f"{name} ends in {column.shape[-1]} age groups but the grid has {len(grid)}; "
                "put age last"
            )
