"""What each age contributes to the difference in e0, for many pairs: the gradient of e0 integrated
along the straight line between two columns of rates, as in engine.decomposition.straight.
"""

from typing import NamedTuple

import numpy as np

from engine.ages import Array
from engine.compiled.jit import fused
from engine.compiled.rules import Rules, by_infant_rate
from engine.decomposition.straight import BESIDE_JUMP, DOUBLINGS, NODES, WEIGHTS
from engine.panel import Panel
from engine.stages.rates import death_rates


class Room(NamedTuple):
    """For the table of one node, each [age]."""

    ax: Array
    own: Array  # slope of ax in the rate of its own group
    qx: Array
    ex: Array
    per: Array
    reach: Array  # survivors


def explain(rules: Rules, lower: Panel, upper: Panel, by_age: Array, difference: Array) -> None:
    """upper minus lower, panels [pair], into by_age [pair, age] and difference [pair]."""
    start, end = (
        np.ascontiguousarray(death_rates(*np.broadcast_arrays(one.deaths, one.exposure)).mx)
        for one in (lower, upper)
    )
    weight, ratio = (
        np.stack([getattr(one, name) for one in (lower, upper)])
        for name in ("infant_weight", "infant_ratio")
    )
    room = Room(*(np.empty(start.shape[1]) for _ in Room._fields))
    _contributions(rules, start, end, weight, ratio, room, by_age, difference)
    by_age[~np.isfinite(difference)] = np.nan


@fused
def _contributions(
    rules: Rules,
    start: Array,
    end: Array,
    weight: Array,
    ratio: Array,
    room: Room,
    by_age: Array,
    difference: Array,
) -> None:
    """start, end [pair, age] are rates, weight, ratio [end of the line, pair, 2] the infants' mix;
    into by_age [pair, age] and difference [pair]."""
    ages = start.shape[1]
    cuts, toward = np.empty(10 + DOUBLINGS + 3 * ages), np.empty(10 + DOUBLINGS + 3 * ages)
    mx, mean = np.empty(ages), np.empty(ages)
    mix = np.empty((2, 1, 1, 2))
    for p in range(start.shape[0]):
        mean[:] = 0.0
        bent = _bends(rules, start, end, p, room)
        size = _cuts(rules, start, end, weight, ratio, p, bent, cuts, toward)
        for piece in range(size + 1):
            low = cuts[piece - 1] if piece else 0.0
            high = cuts[piece] if piece < size else 1.0
            if high <= low:
                continue
            for node in range(NODES.size):
                t = low + (high - low) * ((1 + NODES[node]) / 2)
                _at(start, end, weight, ratio, p, t, mx, mix)
                _add_slopes(rules, mx, mix, (high - low) * (WEIGHTS[node] / 2), bent, room, mean)
        for x in range(ages):
            by_age[p, x] = mean[x] * (end[p, x] - start[p, x])
        way = end[p, 0] - start[p, 0]
        for piece in range(size):
            after = cuts[piece + 1] if piece + 1 < size else 1.0
            if cuts[piece] < after and toward[piece] == np.sign(way) and way != 0:
                _at(start, end, weight, ratio, p, cuts[piece], mx, mix)
                m0 = mx[0]
                mx[0] = m0 * (1 + BESIDE_JUMP)
                above = _expectancy(rules, mx, mix, bent, room)
                mx[0] = m0 * (1 - BESIDE_JUMP)
                by_age[p, 0] += np.sign(way) * (above - _expectancy(rules, mx, mix, bent, room))
        _at(start, end, weight, ratio, p, 1.0, mx, mix)
        last = _expectancy(rules, mx, mix, bent, room)
        _at(start, end, weight, ratio, p, 0.0, mx, mix)
        difference[p] = last - _expectancy(rules, mx, mix, bent, room)


@fused
def _bends(rules: Rules, start: Array, end: Array, p: int, room: Room) -> bool:
    """Whether more would die than enter in any group anywhere on the line; where not, ax is half
    the width all along but for the first years, and stands in `room` from here on."""
    ax, own, n, full = room.ax, room.own, rules.widths, 0
    for x in range(start.shape[1] - 1):
        full += n[x] / 2 * max(start[p, x], end[p, x]) > 1
        ax[x], own[x] = n[x] / 2, 0.0
    return full > 0


@fused
def _at(
    start: Array,
    end: Array,
    weight: Array,
    ratio: Array,
    p: int,
    t: float,
    mx: Array,
    mix: Array,
) -> None:
    """Rates and mix (of weight and of ratio) at t."""
    for x in range(mx.size):
        mx[x] = start[p, x] + t * (end[p, x] - start[p, x])
    for sex in range(2):
        mix[0, 0, 0, sex] = weight[0, p, sex] + t * (weight[1, p, sex] - weight[0, p, sex])
        mix[1, 0, 0, sex] = ratio[0, p, sex] + t * (ratio[1, p, sex] - ratio[0, p, sex])


@fused
def _cuts(
    rules: Rules,
    start: Array,
    end: Array,
    weight: Array,
    ratio: Array,
    p: int,
    bent: bool,
    cuts: Array,
    toward: Array,
) -> int:
    """Where the line is cut, in order, and in which direction a first-year rule changes there."""
    size, top = 0, start.shape[1] - 1
    for pieces in (rules.first, rules.child):
        for sex in range(2):
            if weight[0, p, sex] <= 0 and weight[1, p, sex] <= 0:
                continue
            for k in range(1, pieces.shape[1]):
                size = _passes(pieces[sex, k, 0], start, end, ratio, p, sex, cuts, toward, size)
    for x in range(top if bent else 0):
        step = end[p, x] - start[p, x]
        size = _cut((2 / rules.widths[x] - start[p, x]) / step, 0.0, cuts, toward, size)
    step, level = end[p, top] - start[p, top], min(start[p, top], end[p, top])
    for _ in range(DOUBLINGS):
        level *= 2
        if level >= start[p, top] and level >= end[p, top]:
            break
        size = _cut((level - start[p, top]) / step, 0.0, cuts, toward, size)
    return size


@fused
def _passes(
    level: float,
    start: Array,
    end: Array,
    ratio: Array,
    p: int,
    sex: int,
    cuts: Array,
    toward: Array,
    size: int,
) -> int:
    """Where ratio * m0 of a sex is at a level; both move evenly, so this is a quadratic."""
    m0, way = start[p, 0], end[p, 0] - start[p, 0]
    times, turn = ratio[0, p, sex], ratio[1, p, sex] - ratio[0, p, sex]
    a, b, c = turn * way, times * way + m0 * turn, times * m0 - level
    half = -(b + np.copysign(np.sqrt(b * b - 4 * a * c), b)) / 2
    size = _cut(half / a, np.sign(b + 2 * a * (half / a)), cuts, toward, size)
    return _cut(c / half, np.sign(b + 2 * a * (c / half)), cuts, toward, size)


@fused
def _cut(t: float, sign: float, cuts: Array, toward: Array, size: int) -> int:
    """One more cut, put in its place; of equal ones the later comes last."""
    if not 0 < t < 1:
        return size
    place = size
    while place > 0 and cuts[place - 1] > t:
        cuts[place], toward[place] = cuts[place - 1], toward[place - 1]
        place -= 1
    cuts[place], toward[place] = t, sign
    return size + 1


@fused
def _table(
    rules: Rules, mx: Array, mix: Array, bent: bool, room: Room
) -> tuple[float, float, float]:
    """Into room [ax, its slope, qx, ex, n / (1 + (n - ax) mx), survivors]; the slope of a(1-4) in
    m0, the years left at the top, and e0."""
    ax, own, qx, ex, per, reach = room
    n, top, child = rules.widths, mx.size - 1, 0.0
    if bent:
        for x in range(top):
            ax[x] = 1 / mx[x] if n[x] / 2 * mx[x] > 1 else n[x] / 2
        for x in range(top):
            own[x] = -1 / mx[x] ** 2 if n[x] / 2 * mx[x] > 1 else 0.0
    if rules.first.shape[1]:
        ax[0], own[0] = by_infant_rate(rules.first, mx[0], mix[0], mix[1], 0, 0)
    if rules.child.shape[1]:
        ax[1], child = by_infant_rate(rules.child, mx[0], mix[0], mix[1], 0, 0)
        own[1] = 0.0
    for x in range(min(2, top)):
        if ax[x] * mx[x] > 1:
            ax[x], own[x] = 1 / mx[x], -1 / mx[x] ** 2
            child = 0.0 if x == 1 else child
    for x in range(top):  # one result a loop: of more, not all could be worked on side by side
        per[x] = n[x] / (1 + (n[x] - ax[x]) * mx[x])
    for x in range(top):
        q = mx[x] * per[x]
        qx[x] = 1.0 if q > 1 else q
    for x in range(top):
        ex[x] = n[x] - (n[x] - ax[x]) * qx[x]
    left = np.nan if mx[top] == 0 else 1 / mx[top]
    ex[top] = left
    alive = 1.0
    for x in range(top):  # up and down at once: each step of either waits for the one before it
        y = top - 1 - x
        reach[x] = alive
        alive -= alive * qx[x]
        left = ex[y] + (left - left * qx[y])
        ex[y] = left
    reach[top] = alive
    return child, ex[top], ex[0]


@fused
def _expectancy(rules: Rules, mx: Array, mix: Array, bent: bool, room: Room) -> float:
    return _table(rules, mx, mix, bent, room)[2]


@fused
def _add_slopes(
    rules: Rules, mx: Array, mix: Array, share: float, bent: bool, room: Room, mean: Array
) -> None:
    """The gradient of e0 in mx, times a share, added to `mean`. With reach the survivors,
    d e0 / d q(x) = reach (a - n - e(x+n)) and d e0 / d a(x) = reach q."""
    child, left, _ = _table(rules, mx, mix, bent, room)
    ax, own, qx, ex, per, reach = room
    n, top, each = rules.widths, mx.size - 1, rules.per_year
    for x in range(top):
        per[x] *= per[x] * each[x]
    for x in range(top):
        per[x] *= share * reach[x] * (ax[x] - n[x] - ex[x + 1])
    for x in range(top):
        mean[x] += per[x]
    for x in range(top if bent else min(2, top)):
        mean[x] += (share * reach[x] * qx[x] + per[x] * mx[x] * mx[x]) * own[x]
    if child != 0:
        mean[0] += (share * reach[1] * qx[1] + per[1] * mx[1] * mx[1]) * child
    mean[top] -= share * reach[top] * left * left
