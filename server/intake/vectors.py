"""The schedules of an upload as the store keeps them."""

from collections.abc import Iterable, Sequence
from dataclasses import replace
from itertools import repeat

import numpy as np

from engine.panel import SEXES
from server.intake.causes.spreading import Spread
from server.intake.cells import parts_of
from server.intake.ledger import Ledger
from server.intake.schedules import Block
from server.store.records import Key, Vector


def vectors(ledger: Ledger) -> dict[Key, Vector]:
    """In the order of their keys within each measure."""
    return _written(ledger.on_common_grids(), ledger.codes)


def vectors_by_cause(ledger: Ledger, spread: Sequence[Spread]) -> dict[Key, Vector]:
    """Deaths by leaves of a cause list, on the grids of all causes. Vectors of nothing but zeros
    are left out."""
    found: dict[Key, Vector] = {}
    people = ledger.of("person_years")
    for one in spread:
        of_file = [block for block in ledger.of("deaths") if block.file == one.file]
        for leaf, code in one.codes.items():
            own = (one.block(block, leaf) for block in of_file)
            deaths = replace(ledger, blocks=(*own, *people)).on_common_grids()
            some = (_some(block) for block in deaths if block.measure == "deaths")
            found.update(_written(some, ledger.codes, code))
    return found


def _some(block: Block) -> Block:
    return block.pick(((block.values != 0) | (block.stated != 0)).any(axis=-1))


def _written(blocks: Iterable[Block], codes: Sequence[str], cause: str = "") -> dict[Key, Vector]:
    found: dict[Key, Vector] = {}
    for block in (one for both in blocks for one in both.with_counted()):
        area, sex, year = parts_of(block.place)
        keys = map(
            Key,
            np.array(codes, object)[area],
            np.array(SEXES, object)[sex],
            year.astype(str).tolist(),
            repeat(block.measure),
            repeat(cause),
        )
        statuses = np.array(["final", "provisional"], object)[block.provisional.astype(int)]
        found.update(
            zip(
                keys,
                map(Vector, statuses, repeat(block.grid), block.values, repeat(block.estimated)),
                strict=True,
            )
        )
    return found
