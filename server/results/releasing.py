"""The one door through which counts reach figures: as released, or in full.

As released, the number of a withheld count is its stand-in, and its age is named beside it; nothing
beyond this door can tell what was counted.
"""

from collections.abc import Mapping
from dataclasses import replace

import numpy as np

from engine.ages import AgeGrid
from server.store import masks, schedules
from server.store.connect import Session
from server.store.masks import Protected
from server.store.records import Hidden, Key, Selection, Vector

Cells = dict[Key, Vector]
FULL = "full"


def released(
    session: Session, collection: str, number: int, chosen: Selection, figures: str
) -> Cells:
    """The selected schedules of an edition. One statement. Raises: Refused where the collection
    has a policy and the edition no mask."""
    if figures == FULL:
        return schedules.load(session, collection, number, chosen)
    return masked(*masks.released(session, collection, number, chosen))


def masked(cells: Mapping[Key, Vector], protected: Protected | None) -> Cells:
    """Schedules as they are shown under a mask. Deaths by cause are not shown under any."""
    if protected is None:
        return dict(cells)
    hidden = protected.kept.mask
    return {
        key: shown(vector, hidden[key]) if key in hidden else vector
        for key, vector in cells.items()
        if not key.cause
    }


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
