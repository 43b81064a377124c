"""What each age contributes to the difference in e0, for many pairs: the gradient of e0 integrated
along the straight line between two columns of rates, as in engine.decomposition.straight.
"""

import numpy as np

from engine.ages import Array
from engine.compiled.jit import fused
from engine.compiled.rules import Rules, by_infant_rate
from engine.decomposition.straight import BESIDE_JUMP, DOUBLINGS, NODES, WEIGHTS
from engine.panel import Panel
from engine.stages.rates import death_rates


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
    _contributions(rules, start, end, weight, ratio, by_age, difference)
    by_age[~np.isfinite(difference)] = np.nan


@fused
def _contributions(
    rules: Rules,
    start: Array,
    end: Array,
    weight: Array,
    ratio: Array,
    by_age: Array,
    difference: Array,
) -> None:
    """start, end [pair, age] are rates, weight, ratio [end of the line, pair, 2] the infants' mix;
    into by_age [pair, age] and difference [pair]."""
    ages = start.shape[1]
    cuts, toward = np.empty(10 + DOUBLINGS + 3 * ages), np.empty(10 + DOUBLINGS + 3 * ages)
    mx, mean = np.empty(ages), np.empty(ages)
    room, mix = np.empty((6, ages)), np.empty((2, 1, 1, 2))
    for p in range(start.shape[0]):
        mean[:] = 0.0
        size = _cuts(rules, start, end, weight, ratio, p, cuts, toward)
        for piece in range(size + 1):
            low = cuts[piece - 1] if piece else 0.0
            high = cuts[piece] if piece < size else 1.0
            if high <= low:
                continue
            for node in range(NODES.size):
                t = low + (high - low) * ((1 + NODES[node]) / 2)
                _at(start, end, weight, ratio, p, t, mx, mix)
                _add_slopes(rules, mx, mix, (high - low) * (WEIGHTS[node] / 2), room, mean)
        for x in range(ages):
            by_age[p, x] = mean[x] * (end[p, x] - start[p, x])
        way = end[p, 0] - start[p, 0]
        for piece in range(size):
            after = cuts[piece + 1] if piece + 1 < size else 1.0
            if cuts[piece] < after and toward[piece] == np.sign(way) and way != 0:
                _at(start, end, weight, ratio, p, cuts[piece], mx, mix)
                m0 = mx[0]
                mx[0] = m0 * (1 + BESIDE_JUMP)
                above = _expectancy(rules, mx, mix, room)
                mx[0] = m0 * (1 - BESIDE_JUMP)
                by_age[p, 0] += np.sign(way) * (above - _expectancy(rules, mx, mix, room))
        _at(start, end, weight, ratio, p, 1.0, mx, mix)
        last = _expectancy(rules, mx, mix, room)
        _at(start, end, weight, ratio, p, 0.0, mx, mix)
        difference[p] = last - _expectancy(rules, mx, mix, room)


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
    for x in range(top):
        step = end[p, x] - start[p, x]
        size = _cut((2 / rules.widths[x] - start[p, x]) / step, 0.0, cuts, toward, size)
    step, least = end[p, top] - start[p, top], min(start[p, top], end[p, top])
    for k in range(1, DOUBLINGS + 1):
        size = _cut((least * 2**k - start[p, top]) / step, 0.0, cuts, toward, size)
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
def _table(rules: Rules, mx: Array, mix: Array, room: Array) -> tuple[float, float, float]:
    """Into room [ax, its slope, qx, ex, ...]; the slope of a(1-4) in m0, the years left at the top,
    and e0."""
    ax, own, qx, ex, per = room[0], room[1], room[2], room[3], room[4]
    n, top, child = rules.widths, mx.size - 1, 0.0
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
    for x in range(top):
        per[x] = 1 / (1 + (n[x] - ax[x]) * mx[x])
    for x in range(top):
        q = n[x] * mx[x] * per[x]
        qx[x] = 1.0 if q > 1 else q
    left = np.nan if mx[top] == 0 else 1 / mx[top]
    for x in range(top):
        ex[x] = ax[x] * qx[x] + (1 - qx[x]) * n[x]
    ex[top] = left
    for x in range(top - 1, -1, -1):
        ex[x] += (1 - qx[x]) * ex[x + 1]
    return child, left, ex[0]


@fused
def _expectancy(rules: Rules, mx: Array, mix: Array, room: Array) -> float:
    return _table(rules, mx, mix, room)[2]


@fused
def _add_slopes(
    rules: Rules, mx: Array, mix: Array, share: float, room: Array, mean: Array
) -> None:
    """The gradient of e0 in mx, times a share, added to `mean`. With reach the survivors,
    d e0 / d q(x) = reach (a - n - e(x+n)) and d e0 / d a(x) = reach q."""
    ax, own, qx, ex, per, reach = room[0], room[1], room[2], room[3], room[4], room[5]
    child, left, _ = _table(rules, mx, mix, room)
    n, top, survivors = rules.widths, mx.size - 1, share
    for x in range(top):
        reach[x] = survivors
        survivors *= 1 - qx[x]
    for x in range(top):
        by_rate = reach[x] * (ax[x] - n[x] - ex[x + 1]) * n[x] * per[x] * per[x]
        by_ax = reach[x] * qx[x] + by_rate * mx[x] * mx[x]
        mean[x] += by_rate + by_ax * own[x]
    if child != 0:
        by_rate = reach[1] * (ax[1] - n[1] - ex[2]) * n[1] * per[1] * per[1]
        mean[0] += (reach[1] * qx[1] + by_rate * mx[1] * mx[1]) * child
    mean[top] -= survivors * left * left
