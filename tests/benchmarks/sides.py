"""Sides of a ratio, measured in turn in one process on one core.

Time is the processor's, so that other work on the machine counts less. A repetition is the least of
some short slots of each side, in rotated order; medians of the repetitions make the ratio, and the
spread of a side is its greatest repetition over its least. A run with a spread above MOST_SPREAD is
void and tried again with more and shorter slots.
"""

import os
import statistics
import time
from collections.abc import Callable, Mapping
from dataclasses import dataclass

REPETITIONS = 7
MOST_SPREAD = 1.3
TRIES = (3, 6, 12)  # slots of a repetition


@dataclass(frozen=True, slots=True)
class Side:
    """Work, and how many units of it one call does."""

    work: Callable[[], object]
    units: int = 1


@dataclass(frozen=True, slots=True)
class Measured:
    """Seconds a unit and spread of each side."""

    seconds: dict[str, float]
    spread: dict[str, float]

    @property
    def void(self) -> bool:
        return max(self.spread.values()) > MOST_SPREAD


def pin() -> None:
    """One core, the last this process may use; the BLAS threads are set before numpy is loaded."""
    os.sched_setaffinity(0, {max(os.sched_getaffinity(0))})


def measure(sides: Mapping[str, Side]) -> Measured:
    for side in sides.values():
        side.work()  # warm
    best: Measured | None = None
    for slots in TRIES:
        found = _once(sides, slots)
        if best is None or max(found.spread.values()) < max(best.spread.values()):
            best = found
        if not best.void:
            break
    assert best is not None
    return best


def _once(sides: Mapping[str, Side], slots: int) -> Measured:
    names = list(sides)
    spent: dict[str, list[float]] = {name: [] for name in names}
    for repetition in range(REPETITIONS):
        least = dict.fromkeys(names, float("inf"))
        for slot in range(slots):
            turn = (repetition + slot) % len(names)
            for name in (*names[turn:], *names[:turn]):
                begun = time.process_time()
                sides[name].work()
                least[name] = min(least[name], time.process_time() - begun)
        for name in names:
            spent[name].append(least[name] / sides[name].units)
    return Measured(
        {name: statistics.median(times) for name, times in spent.items()},
        {name: max(times) / min(times) for name, times in spent.items()},
    )
