"""ax inside the closed groups that no first-year rule is for: half the width, a constant rate, or
Keyfitz's iteration, in which neighbouring groups say how deaths lie in the one between them."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.ages import AgeGrid, Array

Rows = NDArray[np.intp]  # which rows of a batch

FIVE = 5.0
ROUNDS = 60  # at most, of an iteration; human rates rest after 12, the wildest after 40
REST = 1e-15  # relative; what a round may still move of a population that has come to rest


@dataclass(frozen=True, slots=True)
class Lived:
    """ax, the years lived in a group by those who die in it, and its slope in the rate it is read
    off: the group's own, or the infants'. [..., age]"""

    ax: Array
    slope: Array


def halves(n: Array, m: Array) -> Lived:
    """Half the width: deaths lie evenly over the group.

    Shape: n [age], m [..., age].
    """
    ax = np.broadcast_to(n / 2, m.shape).astype(m.dtype)
    return Lived(ax, np.zeros_like(ax))


def constant_rate(n: Array | float, m: Array) -> Lived:
    """A rate that is constant within the group: ax = 1 / m - n / (exp(n m) - 1), so that
    qx = 1 - exp(-n m); never more than 1 / m.

    Shape:   n [age], m [..., age]; half the width where m is 0.
    Source:  Chiang (1984), The Life Table and Its Applications, chapter 7.
    """
    m = np.ascontiguousarray(m)
    y = n * m
    with np.errstate(all="ignore"):
        odds = 1 / np.expm1(y)
        share, slope = 1 / y - odds, odds * (1 + odds) - 1 / y**2
        # near 0 the difference of the two cancels; this is its power series
        near = np.abs(y) < 0.1
        y2 = y * y
        series = 0.5 - y / 12 * (1 - y2 / 60 * (1 - y2 / 42 * (1 - y2 / 40)))
        bend = -1 / 12 + y2 / 240 * (1 - y2 / 25.2 * (1 - y2 * 7 / 200))
    return Lived(n * np.where(near, series, share), n * n * np.where(near, bend, slope))


def held_ends(n: Array, m: Array) -> Lived:
    """What Keyfitz's iteration begins from and keeps where a group has no five-year neighbour on a
    side: half the width, and a constant rate in the last group of a run of five-year groups, where
    rates are so high that half the width is too long."""
    last, half, steady = last_of_run(n), halves(n, m), constant_rate(n, m)
    return Lived(np.where(last, steady.ax, half.ax), np.where(last, steady.slope, half.slope))


INSIDE: dict[str, Callable[[Array, Array], Lived]] = {
    "midpoint": halves,
    "constant_rate": constant_rate,
    "keyfitz": held_ends,
}


def has_neighbours(n: Array) -> NDArray[np.bool_]:
    """Whether a closed group is of five years between two others of five, the lower of which is not
    the first five of life: deaths there lie otherwise. [age]"""
    five = n == FIVE
    between = five.copy()
    between[:2] = between[-1:] = False
    between[1:-1] &= five[:-2] & five[2:]
    return np.asarray(between)


def last_of_run(n: Array) -> NDArray[np.bool_]:
    """Whether a closed group is the last of two or more of five years, [age]."""
    five = n == FIVE
    last = five.copy()
    last[:1] = False
    last[1:] &= five[:-1]
    last[:-1] &= ~five[1:]
    return np.asarray(last)


def bounds(grid: AgeGrid, rule: str) -> Array:
    """The rate at which ax mx reaches 1 in each closed group, where the table bends: 2 / n for half
    the width; inf where a rule keeps below it, [age]."""
    n = grid.widths[:-1]
    if rule == "constant_rate":
        return np.full(n.shape, np.inf)
    smooth = has_neighbours(n) | last_of_run(n) if rule == "keyfitz" else np.zeros(n.shape, bool)
    return np.where(smooth, np.inf, 2 / n)


@dataclass(frozen=True, slots=True)
class Neighbours:
    """ax of the five-year groups between two others, found by Keyfitz's iteration, and of the other
    closed groups."""

    inner: NDArray[np.bool_]  # [age]
    n: Array
    m: Array  # [..., age]
    ax: Array  # [..., age]
    own: Array  # slope of the other groups' ax in their own rate

    def pull(self, g: Array) -> Array:
        """Gradient in the closed groups' mx from that in the inner groups' ax, [..., age].

        At the fixed point a = F(a, m), so da/dm = (1 - dF/da)^-1 dF/dm (implicit function theorem).
        """
        n, m, ax = self.n, self.m, self.ax
        g = np.where(self.inner, g, 0.0)
        with np.errstate(all="ignore"):
            below, here, above, by_m = _slopes(n, m, ax)
            per_m = FIVE / (1 + (n - ax) * m) ** 2
            # what a group's ax moves through its q: only that of inner groups is found by rounds
            per_ax = np.where(self.inner, per_m * m**2, 0.0)
            total = _solve(
                -per_ax[..., 1:] * above[..., :-1],
                1 - per_ax * here,
                -per_ax[..., :-1] * below[..., 1:],
                g,
            )
            by_q = total * here
            by_q[..., :-1] += (total * below)[..., 1:]
            by_q[..., 1:] += (total * above)[..., :-1]
            out = by_q * per_m * (1 + m**2 * self.own) + total * by_m
        return np.where((g != 0).any(axis=-1, keepdims=True), out, 0.0)


def iterate(n: Array, m: Array, start: Lived) -> Neighbours | None:
    """ax of the five-year groups between two others, by Keyfitz's iteration; None without any.

    From the deaths of the table in the group and its neighbours, fitted by a parabola,

        a = n / 2 + (n / 24) (d(x+n) - d(x-n)) / d(x),

    and the table from ax anew until it rests, each population for itself. With z the second term
    over n / 2, z / (1 + z^4)^(1/4) stands in its place, so that ax lies between 0 and n where few
    deaths stand beside many; within a fifth of a year of the middle that moves less than 2e-5. In
    the same way ax bends away below 1 / mx, with a power of 16, so that qx stays below 1.

    Shape:   n [age], m [..., age], start.ax the ax of the other groups.
    Missing: nan spreads over the run, since each group reads its neighbours.
    Source:  Keyfitz (1966), Journal of the American Statistical Association 61 (a life table that
             agrees with the data); Keyfitz (1977), Applied Mathematical Demography, chapter 2.
    """
    inner = has_neighbours(n)
    if not inner.any():
        return None
    rates, begun = (np.ascontiguousarray(part).reshape(-1, len(n)) for part in (m, start.ax))

    def once(ax: Array, some: Rows) -> Array:
        return np.where(inner, _graduated(n, rates[some], ax), begun[some])

    with np.errstate(all="ignore"):
        ax = _at_rest(once, begun).reshape(m.shape)
    return Neighbours(inner, n, m, ax, np.where(inner, 0.0, start.slope))


def _at_rest(once: Callable[[Array, Rows], Array], start: Array) -> Array:
    """Where rows [row, age] come to rest under `once`, each stopping for itself: alone or among
    others it takes the same steps."""
    found, moving = start.copy(), np.arange(len(start))
    for _ in range(ROUNDS):
        before = found[moving]
        after = once(before, moving)
        found[moving] = after
        rests = np.ones(len(moving), bool)
        for part in (np.real, np.imag):  # a derivative rests later than its value
            size = np.abs(part(after)).max(axis=-1)
            rests &= np.abs(part(after) - part(before)).max(axis=-1) <= REST * size
        moving = moving[~rests]
        if not len(moving):
            break
    return found


@dataclass(frozen=True, slots=True)
class _Round:
    """What one round reads, for the groups that have one below and one above: q of the three, the
    part z = over / under of n / 2 by which ax leaves the middle, and ax before it is bounded."""

    below: Array
    here: Array
    above: Array
    over: Array
    under: Array
    raw: Array

    @classmethod
    def of(cls, n: Array, m: Array, ax: Array) -> "_Round":
        q = n * m / (1 + (n - ax) * m)
        below, here, above = q[..., :-2], q[..., 1:-1], q[..., 2:]
        # (d(x+n) - d(x-n)) / (12 d(x)), both sides over the survivors to x - n
        over = (1 - below) * (1 - here) * above - below
        under = 12 * (1 - below) * here
        fourth = _fourth(over) + _fourth(under)
        share = np.where(fourth == 0, 0.0, over / np.sqrt(np.sqrt(fourth)))
        return cls(below, here, above, over, under, n[1:-1] / 2 * (1 + share))


def _graduated(n: Array, m: Array, ax: Array) -> Array:
    """ax of one round, [..., age]; nan in the first and the last group."""
    raw = _Round.of(n, m, ax).raw
    full = _fourth(_fourth(raw * m[..., 1:-1]))
    return _between(raw / np.sqrt(np.sqrt(np.sqrt(np.sqrt(1 + full)))), np.nan)


def _slopes(n: Array, m: Array, ax: Array) -> Array:
    """Derivatives of one round's ax by q of the group below, the group itself and the one above,
    and by its own rate: [4, ..., age], 0 in the first and the last group."""
    r, m = _Round.of(n, m, ax), m[..., 1:-1]
    reach, stay = 1 - r.below, 1 - r.here
    fourth = _fourth(r.over) + _fourth(r.under)
    size = fourth * np.sqrt(np.sqrt(fourth))
    by_over = np.where(fourth == 0, 0.0, _fourth(r.under) / size)
    by_under = np.where(fourth == 0, 0.0, -r.over * r.under * r.under * r.under / size)
    full = _fourth(_fourth(r.raw * m))
    held = 1 / ((1 + full) * np.sqrt(np.sqrt(np.sqrt(np.sqrt(1 + full)))))
    by_share = n[1:-1] / 2 * held
    slopes = (
        by_share * (-by_over * (stay * r.above + 1) - by_under * 12 * r.here),
        by_share * (-by_over * reach * r.above + by_under * 12 * reach),
        by_share * by_over * reach * stay,
        -r.raw * held * np.where(m == 0, 0.0, full / m),
    )
    return np.stack([_between(slope, 0.0) for slope in slopes])


def _solve(lower: Array, middle: Array, upper: Array, right: Array) -> Array:
    """The solution [..., age] of a system of three bands, by elimination along age."""
    right, middle = right + 0 * middle, middle.copy()
    for x in range(1, right.shape[-1]):
        part = lower[..., x - 1] / middle[..., x - 1]
        middle[..., x] -= part * upper[..., x - 1]
        right[..., x] -= part * right[..., x - 1]
    right[..., -1] /= middle[..., -1]
    for x in reversed(range(right.shape[-1] - 1)):
        right[..., x] = (right[..., x] - upper[..., x] * right[..., x + 1]) / middle[..., x]
    return right


def _between(values: Array, edge: float) -> Array:
    """The first and the last group put to the values of those between them."""
    ends = np.full_like(values[..., :1], edge)
    return np.concatenate([ends, values, ends], axis=-1)


def _fourth(x: Array) -> Array:
    return np.asarray(x * x * x * x)
