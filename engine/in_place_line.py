"""Differences in e0 of ordinary pairs by numpy, each step into arrays kept for it; as in_place.

A pair is ordinary where its straight line of rates has no bend, no jump and no cut: e0 and its
gradient are plain arithmetic at every node then.
"""

from dataclasses import dataclass, fields

import numpy as np

from engine.ages import AgeGrid, Array
from engine.decomposition.straight import NODES, WEIGHTS
from engine.in_place import BELOW_ONE, LEAST, Flags, early_rules
from engine.panel import Panel
from engine.settings import Settings
from engine.stages.rates import death_rates
from engine.stages.separation import Pieces, by_infant_rate

SHARES = (1 + NODES) / 2  # how far along the line the nodes are


@dataclass(frozen=True, slots=True)
class Room:
    """For a block of pairs: [row, age] or, of closed groups, [row, group]."""

    rules: list[tuple[Pieces, Pieces]]
    n: Array
    after: Array  # n - ax, years left in the group after deaths
    mx: Array
    per: Array
    px: Array
    lx: Array
    Lx: Array
    Tx: Array
    slope: Array

    @classmethod
    def of(cls, grid: AgeGrid, settings: Settings, rows: int) -> "Room":
        n = np.tile(grid.widths[:-1], (rows, 1))
        whole, closed = np.empty((rows, len(grid))), np.empty_like(n)
        like = (closed, whole, closed, closed, whole, whole, whole, closed)
        return cls(early_rules(grid, settings), n, *(one.copy() for one in like))

    def first(self, rows: int) -> "Room":
        """The same room for fewer pairs."""
        arrays: list[Array] = [getattr(self, one.name) for one in fields(self)[1:]]
        return Room(self.rules, *(array[:rows] for array in arrays))


@dataclass(frozen=True, slots=True)
class Way:
    """Lines of rates [row, age] and of the infants' mix [row, 2]: where they start, how far."""

    mx: tuple[Array, Array]
    weight: tuple[Array, Array]
    ratio: tuple[Array, Array]


def explain(lower: Panel, upper: Panel, room: Room, by_age: Array, difference: Array) -> Flags:
    """upper minus lower of a block into by_age [row, age] and difference [row]; which pairs are
    ordinary, [row]. The others hold nothing of use."""
    with np.errstate(all="ignore"):
        ends = [
            np.array(death_rates(*np.broadcast_arrays(one.deaths, one.exposure)).mx, float)
            for one in (lower, upper)
        ]
        room, way = room.first(len(difference)), _way(lower, upper, ends)
        by_age[:] = 0.0
        for share, weight in zip(SHARES.tolist(), (WEIGHTS / 2).tolist(), strict=True):
            _add_slopes(room, way, share, weight, by_age)
        by_age *= way.mx[1]
        first, fewest = _expectancy(room, way, 0.0)
        last, fewer = _expectancy(room, way, 1.0)
        difference[:] = last - first
        straight = _straight(room, ends) & _within_pieces(room.rules, lower, upper, ends)
        return straight & (np.minimum(fewest, fewer) > LEAST) & np.isfinite(difference)


def _way(lower: Panel, upper: Panel, ends: list[Array]) -> Way:
    mixes = (
        (getattr(lower, name), getattr(upper, name) - getattr(lower, name))
        for name in ("infant_weight", "infant_ratio")
    )
    return Way((ends[0], ends[1] - ends[0]), *mixes)


def _straight(room: Room, ends: list[Array]) -> Flags:
    """Whether no group loses more than enter it and the open group's rate never doubles."""
    most, (start, end) = room.slope, (one[:, -1] for one in ends)
    np.maximum(ends[0][:, :-1], ends[1][:, :-1], out=most)
    most *= room.n
    apart = np.maximum(start, end) / np.minimum(start, end)
    return np.asarray((most.max(axis=1) < 2 * BELOW_ONE) & (apart < 2 * BELOW_ONE))


def _within_pieces(
    rules: list[tuple[Pieces, Pieces]], lower: Panel, upper: Panel, ends: list[Array]
) -> Flags:
    """Whether each sex's infant rate surely stays within one piece of each rule."""
    found = np.ones(len(ends[0]), bool)
    low, high = (side(ends[0][:, 0], ends[1][:, 0]) for side in (np.minimum, np.maximum))
    for sex in (0, 1):
        ratios = lower.infant_ratio[..., sex], upper.infant_ratio[..., sex]
        counts = (lower.infant_weight[..., sex] > 0) | (upper.infant_weight[..., sex] > 0)
        least, most = low * np.minimum(*ratios), high * np.maximum(*ratios)
        for rule in rules:
            for level, _, _ in rule[sex][1:]:
                beside = (most < level * BELOW_ONE) | (least * BELOW_ONE > level)
                found &= beside | ~counts
    return found


def _table(room: Room, way: Way, t: float) -> Array:
    """Rates, survivors and person-years at t; -> slopes of the rules in m0, [rule, row]."""
    start, step = way.mx
    np.multiply(step, t, out=room.mx)
    np.add(room.mx, start, out=room.mx)
    np.divide(room.n, 2, out=room.after)
    slopes = np.zeros((len(room.rules), len(start)))
    weight, ratio = (one + t * far for one, far in (way.weight, way.ratio))
    for k, rule in enumerate(room.rules):
        early = by_infant_rate(rule, room.mx[:, 0], weight, ratio)
        np.subtract(room.n[:, k], early.ax, out=room.after[:, k])
        slopes[k] = early.slope
    m, per, p, lx = room.mx[:, :-1], room.per, room.px, room.lx
    np.multiply(room.after, m, out=per)
    np.add(per, 1, out=per)
    np.divide(room.n, per, out=per)  # n / (1 + (n - a) m), so that q = m per
    np.multiply(m, per, out=p)
    np.multiply(p, room.after, out=room.Lx[:, :-1])
    np.subtract(1, p, out=p)
    lx[:, 0] = 1.0
    np.multiply.accumulate(p, axis=1, out=lx[:, 1:])
    lived = room.Lx[:, :-1]  # l (n - (n - a) q)
    np.subtract(room.n, lived, out=lived)
    np.multiply(lived, lx[:, :-1], out=lived)
    np.divide(lx[:, -1], room.mx[:, -1], out=room.Lx[:, -1])
    return slopes


def _expectancy(room: Room, way: Way, t: float) -> tuple[Array, Array]:
    """e0 and how many reach the open age, [row]."""
    _table(room, way, t)
    return room.Lx.sum(axis=1), room.lx[:, -1].copy()


def _add_slopes(room: Room, way: Way, t: float, share: float, mean: Array) -> None:
    """The gradient of e0 in mx, times a share, added to `mean`: by the own rate
    -l (n - a + e(x+n)) dq/dm, with l e(x+n) = T(x+n) / p and dq/dm = per^2 / n; by ax, that times
    m^2 and l q beside it."""
    slopes = _table(room, way, t)
    np.add.accumulate(room.Lx[:, ::-1], axis=1, out=room.Tx[:, ::-1])
    slope, per = room.slope, room.per
    np.divide(room.Tx[:, 1:], room.px, out=slope)
    np.multiply(room.lx[:, :-1], room.after, out=room.after)
    np.add(slope, room.after, out=slope)
    np.multiply(slope, per, out=slope)
    np.multiply(slope, per, out=slope)
    np.divide(slope, room.n, out=slope)
    np.multiply(slope, -share, out=slope)
    mean[:, :-1] += slope
    for k, bend in enumerate(slopes):
        m = room.mx[:, k]
        by_ax = share * room.lx[:, k] * (1 - room.px[:, k]) + slope[:, k] * m * m
        mean[:, 0] += by_ax * bend
    mean[:, -1] -= share * room.Lx[:, -1] / room.mx[:, -1]
