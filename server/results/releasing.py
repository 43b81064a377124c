"""The one door through which counts reach figures: as released, or in full.

As released, the number of a withheld count is its stand-in, and its age is named beside it; nothing
beyond this door can tell what was counted.
"""

from collections.abc import Mapping
from dataclasses import replace

import numpy as np

from engine.ages import AgeGrid
from server.disclosure.showing import shown
from server.store import masks, schedules
from server.store.connect import Session
from server.store.masks import Protected
from server.store.records import Key, Selection, Vector

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
    """Schedules as they are shown under a mask. Deaths by cause are shown of the areas and years
    that the mask was made for; of a cause without any, nil is withheld where its number would
    be."""
    if protected is None:
        return dict(cells)
    hidden, by_cause = protected.kept.mask, protected.kept.by_cause
    found = {
        key: shown(vector, hidden[key]) if key in hidden else vector
        for key, vector in cells.items()
        if not key.cause or (key.area, key.period) in by_cause
    }
    beside = {key[:4]: vector for key, vector in found.items() if key.cause}
    for key, one in hidden.items() if beside else ():
        if key.cause and key not in found and key[:4] in beside:
            nil = np.zeros(len(one.starts))
            empty = replace(beside[key[:4]], grid=AgeGrid(one.starts), values=nil, withheld=())
            found[key] = shown(empty, one)
    return found
