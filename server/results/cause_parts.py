"""What each cause of death, at each age, adds to a difference."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Self

import numpy as np
from scipy.special import ndtri

from engine import decomposition
from engine.ages import AgeGrid, Array
from engine.causes.counts import CauseCounts
from engine.decomposition import Limits
from engine.indicators import Indicator
from engine.panel import Panel
from engine.settings import Settings
from server.results.causes import NOT_STATED, Causes
from server.results.loading import Loaded
from server.store.records import Break, Cause

TOGETHER = AgeGrid((0,))


@dataclass(frozen=True, slots=True)
class CausePair:
    """Deaths by cause of both sides, and of what both count, on one grid and one list."""

    list: tuple[Cause, ...]
    this: CauseCounts  # [cause, age]
    that: CauseCounts
    shared: Array | None  # [cause, age]
    ratios: tuple[Break, ...]  # of comparability, applied to either
    shifts: tuple[
        tuple[Array, Array], ...
    ]  # of each ratio: what its standard error moves on a side

    @property
    def deaths(self) -> tuple[Array, Array]:
        return self.this.deaths, self.that.deaths

    @property
    def counted(self) -> tuple[Array, Array] | None:
        if self.this.counted is None and self.that.counted is None:
            return None
        return self.this.counts, self.that.counts


@dataclass(frozen=True, slots=True)
class Years:
    """Every year from that to this: [year, age], and by cause where all have them."""

    panel: Panel
    causes: Array | None  # [year, cause, age]

    @classmethod
    def of(cls, panel: Panel, years: Sequence[Loaded]) -> Self:
        known = [year.causes for year in years if year.causes is not None]
        if len(known) < len(years) or len({one.list for one in known}) != 1:
            return cls(panel, None)
        found = [
            year.panel.grid.regroup(one.counts.deaths, panel.grid)
            for year, one in zip(years, known, strict=True)
        ]
        return cls(panel, np.stack(found))


@dataclass(frozen=True, slots=True)
class CauseParts:
    """Contributions of every cause at every age, with their limits; all cells and the remainder
    add up to the difference."""

    key: str  # of the indicator
    list: tuple[Cause, ...]
    ratios: tuple[Break, ...]
    by_group: Array  # [cause, group]
    low: Array
    high: Array
    by_cause: Array  # [cause], all ages
    cause_low: Array
    cause_high: Array
    path: Array | None  # [cause], all ages, through the years between
    deaths: tuple[Array, Array]  # [cause], of this and that
    remainder: float
    difference: float


def side_by_side(
    this: Loaded, that: Loaded, shared: Loaded | None, grid: AgeGrid
) -> CausePair | None:
    """Both sides' deaths by cause; None where one has none, or a code stands for other codes of the
    classification on the two sides. A cause that one side's list lacks has no deaths there."""
    ours, theirs = this.causes, that.causes
    if ours is None or theirs is None:
        return None
    listed = {one.code: one for one in ours.list}
    for one in theirs.list:
        if one.code in listed and listed[one.code].ranges != one.ranges:
            return None
        listed.setdefault(one.code, one)
    unstated = listed.pop(NOT_STATED.code, None)
    rows = (*listed.values(), *([unstated] if unstated else []))
    both = None
    if shared is not None and shared.causes is not None:
        both = _rows(shared.causes.counts.counts, shared.causes, rows)
        both = shared.panel.grid.regroup(both, grid)
    counts = [
        CauseCounts(
            *(
                None if part is None else side.panel.grid.regroup(_rows(part, causes, rows), grid)
                for part in (causes.counts.deaths, causes.counts.counted)
            )  # type: ignore[arg-type]
        )
        for side, causes in ((this, ours), (that, theirs))
    ]
    if both is not None:
        both = np.minimum(both, np.minimum(counts[0].counts, counts[1].counts))
    ratios = tuple(dict.fromkeys((*ours.ratios, *theirs.ratios)))
    shifts = _shifts((this, that), ratios, rows, grid)
    return CausePair(rows, counts[0], counts[1], both, ratios, shifts)


def _rows(values: Array, of: Causes, rows: Sequence[Cause]) -> Array:
    """[..., cause, age] in the order of these rows."""
    place = {one.code: at for at, one in enumerate(of.list)}
    found = np.zeros((*values.shape[:-2], len(rows), values.shape[-1]))
    for at, one in enumerate(rows):
        if one.code in place:
            found[..., at, :] = values[..., place[one.code], :]
    return found


def _shifts(
    sides: tuple[Loaded, Loaded],
    ratios: Sequence[Break],
    rows: Sequence[Cause],
    grid: AgeGrid,
) -> tuple[tuple[Array, Array], ...]:
    """What each ratio moves on the two sides where it is a standard error higher: one error, which
    both share. Where it was not applied to a side, nothing."""

    def moved(side: Loaded, ratio: Break) -> Array:
        causes = side.causes
        if causes is None or causes.shifts is None or ratio not in causes.ratios:
            return np.zeros((len(rows), len(grid)))
        shift = causes.shifts[causes.ratios.index(ratio)]
        return side.panel.grid.regroup(_rows(shift, causes, rows), grid)

    return tuple((moved(sides[0], one), moved(sides[1], one)) for one in ratios)


def cause_parts(
    indicator: Indicator,
    this: Panel,
    that: Panel,
    causes: CausePair,
    groups: AgeGrid,
    years: Years | None,
    settings: Settings,
    *,
    by_chance: bool,
) -> CauseParts:
    """`by_chance`: chance has a part in the difference, so that there are limits."""
    grid = this.grid
    found = decomposition.contributions_by_cause(
        indicator, this, that, settings, causes=causes.deaths
    )
    by_group = grid.regroup(found.by_cause, groups)
    cells = Limits(*[np.full(by_group.shape, np.nan)] * 2)
    sums = Limits(*[np.full((len(causes.list), 1), np.nan)] * 2)
    if by_chance:
        moved = _moved_by_ratios(indicator, this, that, causes, found.by_cause, settings)
        cells, sums = (
            _limits(indicator, this, that, causes, to, moved, settings) for to in (groups, TOGETHER)
        )
    path = None
    if (
        years is not None
        and years.causes is not None
        and years.causes.shape[-2] == len(causes.list)
    ):
        path = decomposition.along_by_cause(
            indicator, years.panel, settings, causes=years.causes
        ).sum(axis=-1)
    return CauseParts(
        indicator.key,
        causes.list,
        causes.ratios,
        by_group,
        cells.low,
        cells.high,
        by_group.sum(axis=-1),
        sums.low[:, 0],
        sums.high[:, 0],
        path,
        (causes.this.deaths.sum(axis=-1), causes.that.deaths.sum(axis=-1)),
        float(found.remainder),
        float(found.difference),
    )


def _limits(
    indicator: Indicator,
    this: Panel,
    that: Panel,
    causes: CausePair,
    groups: AgeGrid,
    moved: Sequence[Array],
    settings: Settings,
) -> Limits:
    """By chance, and by the errors of ratios, which are all cells' alike."""
    low, high = decomposition.contribution_limits(
        indicator,
        this,
        that,
        settings,
        shared=causes.shared,
        groups=groups,
        causes=causes.deaths,
        counted=causes.counted,
    )
    if not moved:
        return Limits(low, high)
    z = float(ndtri((1 + settings.level) / 2))
    by_cause = decomposition.contributions_by_cause(
        indicator, this, that, settings, causes=causes.deaths
    ).by_cause
    value = this.grid.regroup(by_cause, groups)
    out = z * np.sqrt(sum(this.grid.regroup(one, groups) ** 2 for one in moved))
    return Limits(value - np.hypot(value - low, out), value + np.hypot(high - value, out))


def _moved_by_ratios(
    indicator: Indicator,
    this: Panel,
    that: Panel,
    causes: CausePair,
    by_cause: Array,
    settings: Settings,
) -> list[Array]:
    """What each ratio of comparability moves the contributions by where it is a standard error
    higher, [cause, age]: exact, since a contribution is linear in the deaths of its cause."""
    found = []
    for ours, theirs in causes.shifts:
        moved = decomposition.contributions_by_cause(
            indicator,
            this,
            that,
            settings,
            causes=(causes.this.deaths + ours, causes.that.deaths + theirs),
        )
        found.append(moved.by_cause - by_cause)
    return found
