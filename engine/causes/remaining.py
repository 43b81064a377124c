"""Probabilities of dying where only a part of the deaths of a group is left: constant ratio of the
forces of mortality within it, or deaths that lie evenly; and the years lived by those who die."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from engine.chain import Chain
from engine.stages.inside import constant_rate
from engine.stages.separation import has_child_group, has_first_year

ALL_DIE = 1 - 1e-9  # a qx from here on is 1: nobody leaves the group alive


@dataclass(frozen=True, slots=True)
class Left:
    """What is left of a column, and its derivatives by what was there and by the share left; each
    [..., age]."""

    value: Array
    by_all: Array
    by_share: Array


def constant_ratio(qx: Array, share: Array) -> Left:
    """1 - (1 - q)^R: the forces of mortality of all causes keep one ratio throughout the group, R
    the share left of their sum.

    Shape:   qx, share [..., age], closed groups.
    Missing: nan in, nan out. Where all die (q = 1), all die of what is left, if anything is.
    Source:  Chiang (1968), Introduction to Stochastic Processes in Biostatistics, chapter 11.
    >>> constant_ratio(np.array([0.19]), np.array([0.5])).value
    array([0.1])
    """
    alive, all_die = 1 - qx, np.real(qx) >= ALL_DIE
    with np.errstate(all="ignore"):
        force = np.log1p(-qx)
        value = np.where(all_die, np.real(share) > 0, -np.expm1(share * force))
        by_all = np.where(all_die, 0.0, share * (1 - value) / alive)
        by_share = np.where(all_die, 0.0, -(1 - value) * force)
    return Left(value, by_all, by_share)


def uniform(qx: Array, share: Array) -> Left:
    """The probability in a table of its own of what is left, where in that table and in the table
    of what was taken away deaths lie evenly over the group: the q' with q' = q_i + q' q'' / 2 and
    (1 - q') (1 - q'') = 1 - q, q_i = R q the probability beside what was taken away.

    Shape:   qx, share [..., age], closed groups.
    Missing: nan in, nan out. Where all die, half of the deaths suffice for all to die again.
    Source:  Bowers, Gerber, Hickman, Jones & Nesbitt (1997), Actuarial Mathematics, chapter 10.
    >>> uniform(np.array([0.19]), np.array([0.5])).value
    array([0.1])
    """
    gone = 1 - 2 * share  # what was taken away, less what is left
    middle = 1 - gone * qx / 2
    with np.errstate(all="ignore"):
        root = np.sqrt(middle**2 - 2 * share * qx)
        value = 2 * share * qx / (middle + root)
        by_all = (share + value * gone / 2) / root
        by_share = qx * (1 - value) / root
    still = np.real(root) <= 1 - ALL_DIE
    return Left(value, *(np.where(still, 0.0, by) for by in (by_all, by_share)))


LAWS: dict[str, Callable[[Array, Array], Left]] = {
    "constant_ratio": constant_ratio,
    "uniform": uniform,
}


@dataclass(frozen=True, slots=True)
class Lived:
    """ax of the closed groups where a part of the deaths is left, and its derivatives by the q left
    (where it is read off that), the q, ax and share there were."""

    ax: Array
    by_left: Array
    by_qx: Array
    by_ax: Array
    by_share: Array


def lived(chain: Chain, left: Left, share: Array) -> Lived:
    """Years lived in each closed group by those who die of what is left.

    Where the chain takes death rates as constant within a group, they are so again. Elsewhere the
    years that a group loses by its deaths shrink as these do, (n - a') q' = R (n - a) q: nearly
    half the width stays half the width, and infants' deaths stay early.

    Source:  Preston, Heuveline & Guillot (2001), Demography, chapter 4 (a of a cause-deleted table,
             n + R (q / q') (a - n)).
    """
    table = chain.table
    n, q, a = table.grid.widths[:-1], table.qx[..., :-1], table.ax[..., :-1]
    with np.errstate(all="ignore"):
        some = (np.real(q) > 0) & (np.real(share) > 0)
        # without deaths, or with hardly any left, the limit of R q / q'
        none = np.where(np.real(q) > 0, q / left.by_share, 1.0)
        ratio = np.where(some, share * q / left.value, none)
        by_q = np.where(some, (share - ratio * left.by_all) / left.value, 0.0)
        by_share = np.where(some, (q - ratio * left.by_share) / left.value, 0.0)
        force = -np.log1p(-left.value)
        steady, even = constant_rate(n, force / n), steady_groups(chain)
        by_force = steady.slope / (n * (1 - left.value))
    zero = np.zeros_like(ratio)
    return Lived(
        np.where(even, steady.ax, n - (n - a) * ratio),
        np.where(even, by_force, zero),
        np.where(even, zero, -(n - a) * by_q),
        np.where(even, zero, ratio),
        np.where(even, zero, -(n - a) * by_share),
    )


def steady_groups(chain: Chain) -> NDArray[np.bool_]:
    """Whether the chain takes the death rate as constant within a closed group, [age]."""
    settings, grid = chain.settings, chain.table.grid
    steady = np.full(len(grid) - 1, settings.inside == "constant_rate")
    if has_first_year(grid):
        steady[0] = settings.first_year == "constant_rate"
    if has_child_group(grid):
        steady[1] = settings.child == "constant_rate"
    if chain.closed.law_from is not None:
        steady[chain.closed.law_from :] = True
    return steady
