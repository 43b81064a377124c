"""How the mean slope on the line moves with the rates at its ends: second derivatives."""

import numpy as np

from engine.ages import Array
from engine.blocks import blocks
from engine.chain import Reading, gradient
from engine.decomposition.straight import Line

NODES, WEIGHTS = np.polynomial.legendre.leggauss(2)
NUDGE = 1e-6  # relative; one rate's step where the bend of the gradient is read


def bends(indicator: Reading, line: Line, mean: Array) -> tuple[Array, Array]:
    """Derivatives of the mean slope in the rates of the line's end and of its start, each
    [age moved, ..., age]: the integrals of t H and (1 - t) H, H the second derivatives.

    H is read by forward differences of the gradient at two nodes: enough for what corrects the
    standard error of a contribution, not the contribution itself (within 2 % on the pairs of the
    tests, and 3 % at ages past 90 where a rate passes the bound of ax).
    """
    t = ((1 + NODES) / 2).reshape(-1, *(1,) * (mean.ndim - 1))
    share, at, ages = (WEIGHTS / 2).reshape(-1, *(1,) * mean.ndim), t[..., None], mean.shape[-1]
    nudged = 1 + NUDGE * np.eye(ages + 1, ages, -1)  # the first row moves none
    beside = np.concatenate(
        [
            gradient(indicator, line.at(t, times=nudged[some].reshape(-1, *(1,) * mean.ndim, ages)))
            for some in blocks(ages + 1, len(NODES) * mean.size // ages)
        ]
    )
    way = NUDGE * np.moveaxis(line.from_mx + at * line.step, -1, 0)[..., None]
    second = np.where(way > 0, (beside[1:] - beside[0]) / way, 0.0)
    return (share * at * second).sum(axis=1), (share * (1 - at) * second).sum(axis=1)
