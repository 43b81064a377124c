"""A schedule as it is shown under a mask."""

from dataclasses import replace

import numpy as np

from engine.ages import AgeGrid
from server.store.records import Hidden, Vector


def shown(vector: Vector, hidden: Hidden) -> Vector:
    """One schedule on the groups it is given by: rounded, or its withheld numbers stood in for."""
    if hidden.rounded:
        grid = AgeGrid(hidden.starts) if hidden.starts else vector.grid
        return replace(vector, grid=grid, values=np.array(hidden.values), rounded=hidden.rounded)
    grid, values = vector.grid, vector.values
    if hidden.starts and hidden.starts != grid.starts:
        coarser = AgeGrid(hidden.starts)
        grid, values = coarser, grid.regroup(values, coarser)
    values = np.array(values)
    ages = []
    for age, value in zip(hidden.ages, hidden.values, strict=True):
        if age >= 0:
            values[grid.position(age)] = value
            ages.append(age)
    return replace(vector, grid=grid, values=values, withheld=tuple(ages))
