"""What each age contributes to the difference in e0, for many pairs: the gradient of e0 integrated
along the straight line between two columns of rates, as in engine.decomposition.straight.

LANES pairs are worked on side by side, [age, lane], so that what is carried from age to age is
carried for all of them at once. Each lane has its own place on its own line; where a line is cut
into fewer pieces than one beside it, its lane stands at the end with no weight.
"""

from typing import NamedTuple

import numpy as np

from engine.ages import Array
from engine.compiled.cuts import Cuts, Pairs, cut, edge, uncut
from engine.compiled.jit import aligned, fused
from engine.compiled.rules import Rules, by_infant_rate
from engine.decomposition.straight import BESIDE_JUMP, NODES, WEIGHTS
from engine.panel import Panel
from engine.stages.rates import death_rates

LANES = 32  # so many that the steps from one age to the next need not wait for each other


class Lines(NamedTuple):
    """The lines of LANES pairs: where they start and how far they go."""

    mx: Array  # [age, lane]
    mx_step: Array
    weight: Array  # [sex, lane]
    weight_step: Array
    ratio: Array
    ratio_step: Array
    infant: Array  # [2, lane]; the first row of mx and of its step


class Places(NamedTuple):
    """A place on each line, and the tables there as far as they are needed."""

    t: Array  # [lane]
    share: Array  # [lane]; weight of the place
    ax: Array  # [age, lane], as all that follows but the last four
    qx: Array
    after: Array  # years of the group not lived by those who die in it
    drop: Array  # by what e0 falls as mx rises, for each year that a death takes; times the weight
    mean: Array  # the gradient of e0 in mx, summed over places
    bend: Array  # [group, lane]; slope of ax in m0, of the first two groups
    ahead: Array  # [group, lane]; e(x+n), of the same
    alive: Array  # [lane]; in the end, who reaches the open age
    left: Array  # [lane]; in the end, e0


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
    whole, two, one = (len(rules.starts), LANES), (2, LANES), (LANES,)
    lines = Lines(*(aligned(*shape) for shape in (whole, whole, *(two,) * 5)))
    shapes = (one, one, *(whole,) * 5, two, two, one, one)
    places = Places(*(aligned(*shape) for shape in shapes))
    places.ax[:] = rules.widths[:, None] / 2
    pairs, cuts = Pairs(start, end, weight, ratio), uncut(rules, LANES)
    _contributions(rules, pairs, lines, cuts, places, by_age, difference)
    by_age[~np.isfinite(difference)] = np.nan


@fused
def _contributions(
    rules: Rules,
    pairs: Pairs,
    lines: Lines,
    cuts: Cuts,
    places: Places,
    by_age: Array,
    difference: Array,
) -> None:
    for first in range(0, by_age.shape[0], LANES):
        _load(pairs, first, lines)
        most = cut(rules, pairs, first, cuts)
        _clear(places.mean)
        for piece in range(most + 1):
            _add_piece(rules, lines, cuts, piece, places)
        _write(places.mean, lines.mx_step, by_age[first : first + LANES])
        for piece in range(most):
            _add_jumps(rules, lines, cuts, piece, places, by_age[first : first + LANES])
        _differ(rules, lines, places, difference[first : first + LANES])


@fused
def _load(pairs: Pairs, first: int, lines: Lines) -> None:
    """Lanes that are left over take the last pair again."""
    start, end, weight, ratio = pairs
    last = start.shape[0] - 1
    for x in range(start.shape[1]):
        for lane in range(lines.mx.shape[1]):
            p = min(first + lane, last)
            lines.mx[x, lane] = start[p, x]
            lines.mx_step[x, lane] = end[p, x] - start[p, x]
    for sex in range(2):
        for lane in range(lines.mx.shape[1]):
            p = min(first + lane, last)
            lines.weight[sex, lane] = weight[0, p, sex]
            lines.weight_step[sex, lane] = weight[1, p, sex] - weight[0, p, sex]
            lines.ratio[sex, lane] = ratio[0, p, sex]
            lines.ratio_step[sex, lane] = ratio[1, p, sex] - ratio[0, p, sex]
    for lane in range(lines.mx.shape[1]):
        lines.infant[0, lane], lines.infant[1, lane] = lines.mx[0, lane], lines.mx_step[0, lane]


@fused
def _clear(mean: Array) -> None:
    for x in range(mean.shape[0]):
        for lane in range(mean.shape[1]):
            mean[x, lane] = 0.0


@fused
def _add_piece(rules: Rules, lines: Lines, cuts: Cuts, piece: int, places: Places) -> None:
    """The gradient at the nodes of one piece of each line."""
    for node in range(NODES.size):
        for lane in range(places.t.size):
            low, high = edge(cuts, lane, piece), edge(cuts, lane, piece + 1)
            places.t[lane] = low + (high - low) * ((1 + NODES[node]) / 2)
            places.share[lane] = (high - low) * (WEIGHTS[node] / 2)
        _add_slopes(rules, lines, places)


@fused
def _write(mean: Array, step: Array, by_age: Array) -> None:
    for x in range(by_age.shape[1]):
        for lane in range(by_age.shape[0]):
            by_age[lane, x] = mean[x, lane] * step[x, lane]


@fused
def _add_jumps(
    rules: Rules, lines: Lines, cuts: Cuts, piece: int, places: Places, by_age: Array
) -> None:
    """What e0 jumps by where the infant rate moves through the break of a first-year rule: e0 just
    above the break less e0 just below."""
    some = False
    for lane in range(places.t.size):
        places.t[lane], places.share[lane] = edge(cuts, lane, piece + 1), 0.0
        some |= _jump(lines, cuts, lane, piece) != 0
    if not some:
        return
    for side in (1, -1):
        _scale(lines, 1 + side * BESIDE_JUMP)
        _add_slopes(rules, lines, places)
        for lane in range(by_age.shape[0]):
            jump = _jump(lines, cuts, lane, piece)
            by_age[lane, 0] += side * jump * places.left[lane] if jump != 0 else 0.0
    _scale(lines, 1.0)


@fused
def _jump(lines: Lines, cuts: Cuts, lane: int, piece: int) -> float:
    """In which direction the infant rate moves through a break at the end of a piece, if it does;
    of equal cuts the last one counts."""
    if piece >= cuts.many[lane] or edge(cuts, lane, piece + 1) >= edge(cuts, lane, piece + 2):
        return 0.0
    toward = cuts.toward[lane, piece]
    return float(toward if toward == np.sign(lines.infant[1, lane]) else 0.0)


@fused
def _scale(lines: Lines, times: float) -> None:
    """The infant rate, so many times what it is."""
    for lane in range(lines.infant.shape[1]):
        lines.mx[0, lane] = lines.infant[0, lane] * times
        lines.mx_step[0, lane] = lines.infant[1, lane] * times


@fused
def _differ(rules: Rules, lines: Lines, places: Places, difference: Array) -> None:
    """e0 at the end less e0 at the start."""
    for end in range(2):
        for lane in range(places.t.size):
            places.t[lane], places.share[lane] = end, 0.0
        _add_slopes(rules, lines, places)
        for lane in range(difference.size):
            difference[lane] = places.left[lane] - (difference[lane] if end else 0.0)


@fused
def _add_slopes(rules: Rules, lines: Lines, places: Places) -> None:
    """The gradient of e0 in mx at these places, times their weight, added to the mean."""
    t, share, ax, qx, after, drop, mean, _, ahead, alive, left = places
    if rules.first.shape[1]:
        _early(rules.first, lines, 0, places)
    if rules.child.shape[1]:
        _early(rules.child, lines, 1, places)
    _down(rules, lines.mx, lines.mx_step, t, share, ax, qx, after, drop, alive)
    _close(lines.mx[-1], lines.mx_step[-1], t, share, alive, left, mean[-1])
    _up(rules, qx, after, drop, mean, left, ahead)
    if rules.first.shape[1]:
        _add_bend(lines, 0, places)
    if rules.child.shape[1]:
        _add_bend(lines, 1, places)


@fused
def _early(pieces: Array, lines: Lines, group: int, places: Places) -> None:
    """ax of one of the first two groups, and its slope in m0."""
    for lane in range(places.t.size):
        t = places.t[lane]
        places.ax[group, lane], places.bend[group, lane] = by_infant_rate(
            pieces,
            lines.mx[0, lane] + t * lines.mx_step[0, lane],
            lines.weight[0, lane] + t * lines.weight_step[0, lane],
            lines.weight[1, lane] + t * lines.weight_step[1, lane],
            lines.ratio[0, lane] + t * lines.ratio_step[0, lane],
            lines.ratio[1, lane] + t * lines.ratio_step[1, lane],
        )


@fused
def _down(
    rules: Rules,
    start: Array,
    step: Array,
    t: Array,
    share: Array,
    ax: Array,
    qx: Array,
    after: Array,
    drop: Array,
    alive: Array,
) -> None:
    """From birth on. A death takes l dq/dm for each year, dq/dm = per^2 / n with q = m per; where
    more would die than enter, all of them die, 1 / m years after they do."""
    n, per_year = rules.widths, rules.per_year
    for lane in range(alive.size):
        alive[lane] = 1.0
    for x in range(ax.shape[0] - 1):
        for lane in range(LANES):
            m = start[x, lane] + t[lane] * step[x, lane]
            full = ax[x, lane] * m > 1
            per = n[x] / (n[x] * m if full else 1 + (n[x] - ax[x, lane]) * m)
            q = 1.0 if full else m * per
            qx[x, lane] = q
            after[x, lane] = n[x] - (per if full else ax[x, lane])
            drop[x, lane] = share[lane] * alive[lane] * per * per * per_year[x]
            alive[lane] -= alive[lane] * q


@fused
def _close(
    start: Array, step: Array, t: Array, share: Array, alive: Array, left: Array, mean: Array
) -> None:
    """The open group: 1 / m years are left, nobody knows how many where nobody died."""
    for lane in range(left.size):
        m = start[lane] + t[lane] * step[lane]
        left[lane] = np.nan if m == 0 else 1 / m
        mean[lane] -= share[lane] * alive[lane] * left[lane] * left[lane]


@fused
def _up(
    rules: Rules, qx: Array, after: Array, drop: Array, mean: Array, left: Array, ahead: Array
) -> None:
    """From the top: a death takes the years after it in the group and those left at its end. Where
    all die, e0 falls by l / m^2, for they live 1 / m years."""
    n = rules.widths
    for x in range(qx.shape[0] - 2, -1, -1):
        for lane in range(left.size if x < 2 else 0):
            ahead[x, lane] = left[lane]
        for lane in range(LANES):
            taken = n[x] if qx[x, lane] >= 1 else after[x, lane] + left[lane]
            mean[x, lane] -= drop[x, lane] * taken
            lived = n[x] - after[x, lane] * qx[x, lane]
            left[lane] = lived + (left[lane] - left[lane] * qx[x, lane])


@fused
def _add_bend(lines: Lines, group: int, places: Places) -> None:
    """The part of m0 that goes by way of ax: a year more is lived by l q, and moves q by m^2 of
    what m itself does; none where ax is at its bound."""
    for lane in range(places.t.size):
        m = lines.mx[group, lane] + places.t[lane] * lines.mx_step[group, lane]
        q, before = places.qx[group, lane], 0.0 if group == 0 else places.qx[0, lane]
        taken = places.after[group, lane] + places.ahead[group, lane]
        lived = places.share[lane] * (1 - before) * q - places.drop[group, lane] * m * m * taken
        places.mean[0, lane] += 0.0 if q >= 1 else lived * places.bend[group, lane]
