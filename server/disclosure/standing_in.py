"""What stands in for withheld counts in figures: worked out from what is shown and nothing else.

Each withheld count begins at what is shown for many more, such as the people there times their
death rate; then all are moved as little as can be (by Kullback and Leibler's divergence; raking,
after Deming and Stephan (1940), Annals of Mathematical Statistics 11:427-444) until they add up,
with what is shown, to every sum that is shown.
"""

import numpy as np
from scipy.optimize import linprog
from scipy.sparse import csr_array, diags_array, hstack
from scipy.sparse.linalg import splu

from engine.ages import Array
from server.disclosure.blocks import TOTAL, Block, Bools
from server.disclosure.equations import Equations

_STEPS = 40
_ENOUGH = 1e-9  # of a sum: nothing is gained by adding up more exactly
_NEAR = 1e-6  # of a sum: farther off there is no way to it


def stand_ins(of: Block, hidden: Bools, rules: Equations, *, begin: Array) -> Array:
    """[slot, sex]: shown counts as they are, withheld ones stood in for by those that add up and
    are nearest to `begin`."""
    values = np.where(hidden, np.maximum(begin, 1e-3), of.values)
    unknown = np.flatnonzero(hidden.ravel())
    if not len(unknown):
        return np.asarray(values)
    shown = np.where(hidden.ravel(), 0.0, np.nan_to_num(of.values.ravel()))
    part, sums = csr_array(rules.matrix[:, unknown]), rules.right - rules.matrix @ shown
    nil = _nil(part, sums)
    part = csr_array(part[:, ~nil])
    rows = np.flatnonzero(np.diff(part.indptr))
    flat = values.ravel()
    flat[unknown[nil]] = 0.0
    flat[unknown[~nil]] = _raked(flat[unknown[~nil]], part[rows], sums[rows])
    return np.asarray(flat.reshape(values.shape))


def _nil(part: csr_array, sums: Array) -> Bools:
    """Unknowns of which a sum of 0 shows that there are none."""
    nil = np.zeros(part.shape[1], bool)
    while True:
        left = csr_array(part[:, ~nil])
        signs = np.stack([(left > 0).sum(axis=1), (left < 0).sum(axis=1)])
        rows = (np.abs(sums) < _ENOUGH) & (signs > 0).any(axis=0) & (signs == 0).any(axis=0)
        if not rows.any():
            return nil
        nil[np.flatnonzero(~nil)[np.unique(left[np.flatnonzero(rows)].indices)]] = True


def _raked(begin: Array, matrix: csr_array, sums: Array) -> Array:
    """The positive numbers nearest `begin` with these sums, by Newton's method on the multipliers;
    as near as can be where the sums cannot all be had."""
    multipliers = np.zeros(len(sums))
    turned = csr_array(matrix.T)
    values = begin
    size = np.maximum(np.abs(sums), 1.0)
    off = np.abs(matrix @ values - sums) / size
    for _step in range(_STEPS):
        if off.max() < _ENOUGH:
            break
        slope = matrix @ diags_array(values) @ turned
        slope = slope + diags_array(np.full(len(sums), 1e-9 * (1.0 + slope.diagonal().max())))
        move = splu(slope.tocsc()).solve(sums - matrix @ values)
        share = 1.0
        while share > 1e-4:
            tried = begin * np.exp(np.clip(turned @ (multipliers + share * move), -40.0, 40.0))
            worse = np.abs(matrix @ tried - sums) / size
            if worse.sum() < off.sum():
                break
            share /= 2
        else:
            break
        multipliers = multipliers + share * move
        values, off = tried, worse
    return np.asarray(values) if off.max() < _NEAR else _fitted(values, matrix, sums)


def _fitted(begin: Array, matrix: csr_array, sums: Array) -> Array:
    """The same where only numbers of which some are 0 have these sums: none below 0, and with the
    least sum of shares by which they leave `begin`; `begin` where none have them."""
    size, count = np.maximum(begin, 1e-3), len(begin)
    away = np.tile(1 / size, 2)  # above and below
    both = hstack([matrix, -matrix])
    bounds = np.stack([np.zeros(2 * count), np.append(np.full(count, np.inf), begin)], axis=1)
    found = linprog(away, A_eq=csr_array(both), b_eq=sums - matrix @ begin, bounds=bounds)
    if found.x is None:
        return begin
    return np.asarray(np.maximum(begin + found.x[:count] - found.x[count:], 0.0))


def expected(of: Block, hidden: Bools, typical: float) -> Array:
    """People times the shown rate of those at that age: of the wholes where shown, else of all;
    `typical` where no rate is."""
    tops = np.array([not area.parent for area in of.areas], bool)[of.area]
    rates = np.full(of.values.shape, np.nan)
    for rows in (np.ones(len(tops), bool), tops):  # the better one is written last
        rates = _rates(of, hidden, rows, rates)
    with np.errstate(invalid="ignore"):
        deaths = rates * of.exposure
    known = np.isfinite(deaths) & (deaths > 0)
    return np.asarray(np.where(known, deaths, typical))


def _rates(of: Block, hidden: Bools, rows: Bools, otherwise: Array) -> Array:
    """Deaths over person-years of the slots in `rows` that are shown, at the ages of every slot."""
    ages = of.start != TOTAL
    use = (rows & ages)[:, None] & ~hidden & of.held & np.isfinite(of.exposure)
    edges, place = np.unique(of.start, return_inverse=True)
    sums = np.zeros((2, len(edges), 3))
    for total, part in zip(sums, (of.values, of.exposure), strict=True):
        np.add.at(total, place, np.where(use, part, 0.0))
    sums[:, edges == TOTAL] = sums.sum(axis=1, keepdims=True)  # of a sum: the rate at all ages
    with np.errstate(all="ignore"):
        mean = np.where(sums[1] > 0, sums[0] / sums[1], np.nan)[place]
    return np.asarray(np.where(np.isfinite(mean), mean, otherwise))
