"""Where a straight line between two columns of rates is cut; engine.decomposition.straight."""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from engine.compiled.jit import fused
from engine.compiled.rules import PIECES, Rules
from engine.decomposition.straight import DOUBLINGS


class Pairs(NamedTuple):
    """Lines of rates [pair, age] and of the infants' mix [end of the line, pair, 2]."""

    start: Array
    end: Array
    weight: Array
    ratio: Array


class Cuts(NamedTuple):
    """Where these lines are cut."""

    at: Array  # [lane, cut], in order
    toward: Array  # direction in which a first-year rule changes there; 0 at other cuts
    many: NDArray[np.intp]  # [lane]


def uncut(rules: Rules, lanes: int) -> Cuts:
    """Room for all cuts that so many lines may have."""
    most = DOUBLINGS + len(rules.starts) + 2 * 2 * 2 * (PIECES - 1)
    return Cuts(np.zeros((lanes, most)), np.zeros((lanes, most)), np.zeros(lanes, np.intp))


@fused
def edge(cuts: Cuts, lane: int, k: int) -> float:
    """The k-th edge of the pieces of a line."""
    if k == 0:
        return 0.0
    return cuts.at[lane, k - 1] if k <= cuts.many[lane] else 1.0


@fused
def cut(rules: Rules, pairs: Pairs, first: int, cuts: Cuts) -> int:
    """The lines of pairs from the first on; -> how often one is cut at most."""
    most = 0
    for lane in range(cuts.many.size):
        p = min(first + lane, pairs.start.shape[0] - 1)
        cuts.many[lane] = _cut_line(rules, pairs, p, cuts.at[lane], cuts.toward[lane])
        most = max(most, cuts.many[lane])
    return most


@fused
def _cut_line(rules: Rules, pairs: Pairs, p: int, at: Array, toward: Array) -> int:
    """Where first-year rules change, ax meets its bound, and the open group's rate doubles; -> how
    often the line is cut."""
    start, end, count, top = pairs.start, pairs.end, 0, pairs.start.shape[1] - 1
    for pieces in (rules.first, rules.child):
        for sex in range(2):
            if pairs.weight[0, p, sex] <= 0 and pairs.weight[1, p, sex] <= 0:
                continue
            for k in range(1, pieces.shape[1]):
                count = _passes(pieces[sex, k, 0], pairs, p, sex, at, toward, count)
    for x in range(top if _bound(rules, pairs, p) else 0):
        step = end[p, x] - start[p, x]
        count = _insert((2 / rules.widths[x] - start[p, x]) / step, 0.0, at, toward, count)
    step, level = end[p, top] - start[p, top], min(start[p, top], end[p, top])
    for _ in range(DOUBLINGS):
        level *= 2
        if level >= start[p, top] and level >= end[p, top]:
            break
        count = _insert((level - start[p, top]) / step, 0.0, at, toward, count)
    return count


@fused
def _bound(rules: Rules, pairs: Pairs, p: int) -> bool:
    """Whether in any group anywhere on the line more would die than enter."""
    full = 0
    for x in range(pairs.start.shape[1] - 1):
        full += rules.widths[x] / 2 * max(pairs.start[p, x], pairs.end[p, x]) > 1
    return full > 0


@fused
def _passes(
    level: float, pairs: Pairs, p: int, sex: int, at: Array, toward: Array, count: int
) -> int:
    """Where ratio * m0 of a sex is at a level; both move evenly, so this is a quadratic."""
    m0, way = pairs.start[p, 0], pairs.end[p, 0] - pairs.start[p, 0]
    times, turn = pairs.ratio[0, p, sex], pairs.ratio[1, p, sex] - pairs.ratio[0, p, sex]
    a, b, c = turn * way, times * way + m0 * turn, times * m0 - level
    half = -(b + np.copysign(np.sqrt(b * b - 4 * a * c), b)) / 2
    count = _insert(half / a, np.sign(b + 2 * a * (half / a)), at, toward, count)
    return _insert(c / half, np.sign(b + 2 * a * (c / half)), at, toward, count)


@fused
def _insert(t: float, sign: float, at: Array, toward: Array, count: int) -> int:
    """One more cut, put in its place; of equal ones the later comes last."""
    if not 0 < t < 1:
        return count
    place = count
    while place > 0 and at[place - 1] > t:
        at[place], toward[place] = at[place - 1], toward[place - 1]
        place -= 1
    at[place], toward[place] = t, sign
    return count + 1
