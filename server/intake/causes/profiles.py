"""Shares of causes in the deaths of an area and year, and their steps from one year to the next.

All are of both sexes and all ages together. A step is judged by its standard error, widened by as
much as the causes of the area, or the cause itself, move: of their squared steps the median, over
that of a chi-square number with one degree of freedom.
"""

from collections import defaultdict
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from engine.ages import Array
from server.intake.standing import Standing
from server.store.records import Break, Cause, Key, Vector

LEAST = 100  # deaths of an area and year whose shares are looked at
MIDDLE = 0.4549  # median of a chi-square number with one degree of freedom
ENOUGH = 4  # steps of a cause that tell how it moves
BACK = 2  # years to look back for the year before


@dataclass(frozen=True, slots=True)
class Line:
    """Deaths of one area and year by leaves, those without cause last."""

    counts: Array  # [leaf + 1]
    provisional: bool

    @property
    def total(self) -> float:
        return float(self.counts.sum())


@dataclass(frozen=True)
class Profiles:
    """What is handed in by cause, and what stands."""

    causes: tuple[Cause, ...]
    own: Mapping[Key, Vector]
    standing: Standing
    breaks: tuple[Break, ...] = ()  # of the upload

    @cached_property
    def leaves(self) -> tuple[Cause, ...]:
        wholes = {cause.parent for cause in self.causes}
        return tuple(cause for cause in self.causes if cause.code not in wholes)

    @cached_property
    def lines(self) -> dict[tuple[str, int], Line]:
        """By area and year, of what is handed in by cause."""
        return _lines(self.own, self.leaves)

    @cached_property
    def before(self) -> dict[tuple[str, int], Line]:
        """What stands under the same list."""
        same = listed(self.causes) == listed(self.standing.causes)
        return _lines(self.standing.cells, self.leaves) if same else {}

    def year_before(self, area: str, year: int) -> int:
        """The last year before one that has deaths by cause; 0: none."""
        years = range(year - 1, year - 1 - BACK, -1)
        return next((one for one in years if self.at(area, one) is not None), 0)

    def at(self, area: str, year: int) -> Line | None:
        return self.lines.get((area, year)) or self.before.get((area, year))

    def coding_changed(self, area: str, first: int, last: int, cause: str) -> bool:
        """Whether a break of coding is stated behind the first year, up to the last."""
        return any(
            one.kind == "coding"
            and one.area in ("", area)
            and one.cause in ("", cause)
            and first < int(one.period) <= last
            for one in (*self.standing.breaks, *self.breaks)
        )

    def shares(self, *kinds: str, without: bool = True) -> Array:
        """Which leaves are of some kinds, [leaf + 1]; and what has no cause."""
        return np.array([*(cause.kind in kinds for cause in self.leaves), without])


def listed(causes: Iterable[Cause]) -> set[Cause]:
    """What of a list is content: labels are not."""
    return {replace(cause, label="") for cause in causes}


def _lines(cells: Mapping[Key, Vector], leaves: tuple[Cause, ...]) -> dict[tuple[str, int], Line]:
    number = {cause.code: at for at, cause in enumerate(leaves)}
    counts: dict[tuple[str, int], Array] = defaultdict(lambda: np.zeros(len(leaves) + 1))
    parted: set[tuple[str, int]] = set()
    unsure: set[tuple[str, int]] = set()
    for key, cell in cells.items():
        if key.measure != "deaths" or _both_beside(cells, key):
            continue
        at = (key.area, int(key.period))
        if not key.cause:
            counts[at][-1] += cell.values.sum()
            unsure |= {at} if cell.status == "provisional" else set()
        elif key.cause in number:
            parted.add(at)
            died = cell.values.sum()
            counts[at][number[key.cause]] += died
            counts[at][-1] -= died
    return {at: Line(counts[at], at in unsure) for at in sorted(parted)}


def _both_beside(cells: Mapping[Key, Vector], key: Key) -> bool:
    """Persons beside women and men."""
    return key.sex == "p" and key._replace(sex="f", cause="") in cells


@dataclass(frozen=True, slots=True)
class Step:
    """From one year of an area to the next that is there."""

    area: str
    first: int
    last: int
    before: Line
    after: Line
    z: Array  # [leaf + 1], steps of the shares in standard errors

    @property
    def shares(self) -> tuple[Array, Array]:
        return self.before.counts / self.before.total, self.after.counts / self.after.total


def steps(profiles: Profiles) -> Iterator[Step]:
    found: dict[str, list[Step]] = defaultdict(list)
    for (area, year), after in profiles.lines.items():
        first = profiles.year_before(area, year)
        before = profiles.at(area, first) if first else None
        if before and min(before.total, after.total) >= LEAST:
            found[area].append(Step(area, first, year, before, after, _z(before, after)))
    for steps in found.values():
        uneven = np.sqrt(_dispersion(np.stack([step.z for step in steps])))
        yield from (replace(step, z=step.z / uneven) for step in steps)


def _z(before: Line, after: Line) -> Array:
    """Steps of the shares over their standard errors at even chance."""
    both = (before.counts + after.counts) / (before.total + after.total)
    error = np.sqrt(both * (1 - both) * (1 / before.total + 1 / after.total))
    step = after.counts / after.total - before.counts / before.total
    return np.divide(step, error, out=np.zeros_like(step), where=error > 0)


def _dispersion(z: Array) -> Array:
    """How much more than by chance the shares of an area move, [step, leaf] -> [leaf]: those of all
    causes or, where there are steps enough, of the cause itself, the greater, and at least 1."""
    squares = np.where(z != 0, z * z, np.nan)
    if np.isnan(squares).all():
        return np.ones(z.shape[-1])
    together = float(np.nanmedian(squares)) / MIDDLE
    known = (~np.isnan(squares)).sum(axis=0) >= ENOUGH
    own = np.ones(z.shape[-1])
    own[known] = np.nanmedian(squares[:, known], axis=0) / MIDDLE
    return np.maximum(own, max(1.0, together))
