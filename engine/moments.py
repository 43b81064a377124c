"""Means over the ages at death of each group of a life table, and what moves them.

Deaths of a closed group stand at their mean age x + ax; beyond the open age the death rate is
constant, so that lengths of life there are exponential with the mean ax.
"""

from collections.abc import Callable

import numpy as np

from engine.ages import Array
from engine.tables import LifeTable

NODES, WEIGHTS = np.polynomial.laguerre.laggauss(32)  # exact for powers of the age up to the 63rd


def group_means(table: LifeTable, reading: Callable[[Array], Array]) -> Array:
    """Mean of reading(age at death) over the deaths of each group; the open group by Gauss-Laguerre
    quadrature.

    Shape:   -> [..., age]; `reading` works element by element, on [..., age] and [..., node].
    Missing: nan in an ax gives nan in its group.
    Source:  Abramowitz & Stegun (1964), Handbook of Mathematical Functions, 25.4.45.
    """
    beyond = (reading(_beyond(table)) * WEIGHTS).sum(axis=-1)
    return np.concatenate([reading(_closed(table)), beyond[..., None]], axis=-1)


def group_slopes(table: LifeTable, slope: Callable[[Array], Array]) -> Array:
    """Derivative of each group's mean by its ax, from the derivative of the reading by age.

    Shape, Missing and Source as in `group_means`.
    """
    beyond = (slope(_beyond(table)) * (WEIGHTS * NODES)).sum(axis=-1)
    return np.concatenate([slope(_closed(table)), beyond[..., None]], axis=-1)


def _closed(table: LifeTable) -> Array:
    ages: Array = np.array(table.grid.starts[:-1], float) + table.ax[..., :-1]
    return ages


def _beyond(table: LifeTable) -> Array:
    """Ages at death beyond the open age at which its quadrature is taken, [..., node]."""
    ages: Array = table.grid.open_age + table.ax[..., -1:] * NODES
    return ages
