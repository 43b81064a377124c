"""What the charts by age share: one age axis, needles or bars by width, gaps kept."""

from collections.abc import Iterable

import numpy as np

from engine.ages import AgeGrid, Array
from server.charts.chart import Series

WHOLE_LIFE = (0.0, 100.0)  # the age axis of every chart, so that an age is one vertical
LONGER_LIFE = (0.0, 110.0)  # where single groups or a law reach beyond


def ages(grid: AgeGrid, *, modelled: bool = False) -> tuple[float, float]:
    """The age axis of a page whose counts are on this grid."""
    return LONGER_LIFE if modelled or grid.open_age > WHOLE_LIFE[1] else WHOLE_LIFE


def places(column: Array) -> tuple[float, ...]:
    """Plain numbers on the x axis."""
    return tuple(float(place) for place in column)


def values(column: Array) -> tuple[float | None, ...]:
    """Numbers to draw; what is missing is a gap."""
    return tuple(float(value) if np.isfinite(value) else None for value in column)


def isolated(column: Array) -> list[int]:
    """Where a line has a point between two gaps, which only a dot can show."""
    known = np.pad(np.isfinite(column), 1)
    return np.flatnonzero(known[1:-1] & ~known[:-2] & ~known[2:]).tolist()


def at_age(grid: AgeGrid, column: Array, age: float) -> float:
    """The column's value in the group that holds an age, or the last one known below it."""
    known = [
        float(value)
        for start, value in zip(grid.starts, column, strict=False)
        if start <= age and np.isfinite(value)
    ]
    return known[-1] if known else 0.0


def single_years(grid: AgeGrid) -> bool:
    """Whether every closed group is one year wide."""
    return bool(np.all(grid.widths[:-1] == 1))


def bars(
    grid: AgeGrid, density: Array, groups: Iterable[int], label: str, *, role: str = "s1"
) -> Series:
    """Closed groups by their density: single years as needles, wider groups as bars."""
    at = list(groups)
    return Series(
        label,
        places(grid.mids[at]),
        values(density[at]),
        draw="needles" if np.all(grid.widths[at] == 1) else "bars",
        role=role,
        widths=places(grid.widths[at]),
        names=tuple(grid.labels[group] for group in at),
    )
