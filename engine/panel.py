"""Deaths and person-years of many populations on one age grid."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import reduce
from typing import Any

import numpy as np

from engine.ages import AgeGrid, Array

SEXES = ("f", "m", "p")  # women, men, persons


BIRTHS = ("live", "stillborn", "neonatal_deaths")  # the last axis of Panel.births


@dataclass(frozen=True, slots=True)
class Panel:
    """Counts [..., age] on one grid, and what some figures must know besides.

    Women and men have rules of their own for the first year of life. A table for persons takes the
    mean of the two, weighted by infant deaths, so a panel carries for women and men (last axis, in
    this order) their share of the infant deaths and their infant death rate over that of the table.

    `whole` is the population of which this one is a part, in the same years and sex: the one to
    borrow a rate from and to be set against. `standard` is one whose people weight the ages. Both
    are panels of the same batch and grid, nan where a population has none.

    `counted` are the deaths as they were counted, where `deaths` hold others that were shared out
    among them (of unknown age, say): chance is in the deaths counted, each of which stands for
    `worth` deaths.
    """

    grid: AgeGrid
    deaths: Array  # [..., age]
    exposure: Array  # [..., age], person-years
    infant_weight: Array  # [..., 2]
    infant_ratio: Array  # [..., 2]
    births: Array  # [..., 3], as in BIRTHS; nan where not handed in
    whole: "Panel | None" = None
    standard: "Panel | None" = None
    counted: Array | None = None  # [..., age]; None: all deaths

    def __post_init__(self) -> None:
        named = (
            ("deaths", "exposure") if self.counted is None else ("deaths", "exposure", "counted")
        )
        for name in named:
            ages = getattr(self, name).shape[-1]
            if ages != len(self.grid):
                raise ValueError(
                    f"{name} ends in {ages} age groups but the grid has {len(self.grid)}; "
                    "put age last"
                )
            if np.any(np.real(getattr(self, name)) < 0):
                raise ValueError(f"{name} has a negative count; counts are at least 0")

    @property
    def batch_shape(self) -> tuple[int, ...]:
        return self.deaths.shape[:-1]

    def over(self, change: Callable[[Array], Array]) -> "Panel":
        """Every array changed alike, where the change is one of the leading axes only."""
        arrays: dict[str, Any] = {name: change(getattr(self, name)) for name in COUNTED}
        if self.counted is not None:
            arrays["counted"] = change(self.counted)
        return replace(self, **arrays, **self._beside(lambda other: other.over(change)))

    @property
    def counts(self) -> Array:
        """Deaths in which chance is, [..., age]: those counted. A group to which deaths were shared
        out though none was counted in it has these themselves."""
        if self.counted is None:
            return self.deaths
        return np.where((self.counted > 0) | np.isnan(self.deaths), self.counted, self.deaths)

    @property
    def worth(self) -> Array | None:
        """Deaths that each one counted stands for, [..., age]; None: one. Where none was, as many
        as in all ages together."""
        if self.counted is None:
            return None
        with np.errstate(divide="ignore", invalid="ignore"):
            together = self.deaths.sum(axis=-1) / self.counts.sum(axis=-1)
            usual = np.where(np.isfinite(together), together, 1.0)[..., None]
            return np.where(self.counts > 0, self.deaths / self.counts, usual)

    def __getitem__(self, where: Any) -> "Panel":
        """Part of the batch; `where` indexes the leading axes only."""
        return self.over(lambda array: np.asarray(array[where]))

    def regroup(self, to: AgeGrid) -> "Panel":
        """The same populations on a coarser grid, exactly."""
        return replace(
            self,
            grid=to,
            deaths=self.grid.regroup(self.deaths, to),
            exposure=self.grid.regroup(self.exposure, to),
            counted=None if self.counted is None else self.grid.regroup(self.counted, to),
            **self._beside(lambda other: other.regroup(to)),
        )

    def _beside(self, change: "Callable[[Panel], Panel]") -> dict[str, Any]:
        """What stands beside the counts, changed like them."""
        others = {name: getattr(self, name) for name in BESIDE}
        return {name: None if one is None else change(one) for name, one in others.items()}

    @classmethod
    def of(cls, grid: AgeGrid, deaths: Array, exposure: Array, *, sex: str) -> "Panel":
        """One sex ('f' or 'm'), or persons ('p') of whom the sexes are not known: then the plain
        mean of the two first-year rules is taken."""
        weight = {"f": (1.0, 0.0), "m": (0.0, 1.0), "p": (0.5, 0.5)}[sex]
        batch = deaths.shape[:-1]
        return cls(
            grid,
            deaths,
            exposure,
            np.broadcast_to(np.array(weight), (*batch, 2)).copy(),
            np.ones((*batch, 2)),
            np.full((*batch, len(BIRTHS)), np.nan),
        )

    @classmethod
    def persons(cls, women: "Panel", men: "Panel") -> "Panel":
        """Women and men together, on their common grid.

        Where a sex has no infant deaths or no infants, its weight is 0; where neither has, the
        weights are one half.
        """
        grid = women.grid.common(men.grid)
        women, men = women.regroup(grid), men.regroup(grid)
        deaths, exposure = women.deaths + men.deaths, women.exposure + men.exposure
        infant = np.stack([women.deaths[..., 0], men.deaths[..., 0]], axis=-1)
        years = np.stack([women.exposure[..., 0], men.exposure[..., 0]], axis=-1)
        total = infant.sum(axis=-1, keepdims=True)
        with np.errstate(divide="ignore", invalid="ignore"):
            weight = np.where(total > 0, infant / total, 0.5)
            ratio = (infant / years) / (total / years.sum(axis=-1, keepdims=True))
        ratio = np.where(np.isfinite(ratio), ratio, 1.0)
        births = women.births + men.births
        counted = _counted([women, men], lambda parts: parts[0] + parts[1])
        return cls(grid, deaths, exposure, weight, ratio, births, counted=counted)

    @classmethod
    def pooled(cls, panels: "Sequence[Panel]") -> "Panel":
        """The counts of several years, or of several areas, of one sex as those of one population,
        on the grid they share: exact sums, so that its rates are weighted by person-years.

        Of persons, pool women and men each and join them afterwards (`persons`): the infants' mix
        is otherwise the mean by infant deaths. What stands beside the counts is pooled likewise.
        """
        grid = reduce(AgeGrid.common, (panel.grid for panel in panels))
        panels = [panel.regroup(grid) for panel in panels]
        infant = np.stack([panel.deaths[..., :1] for panel in panels])
        with np.errstate(all="ignore"):
            share = np.where(infant.sum(axis=0) > 0, infant / infant.sum(axis=0), 1 / len(panels))
        weights: dict[str, Any] = {"infant_weight": share, "infant_ratio": share}
        arrays: dict[str, Any] = {
            name: (weights.get(name, 1.0) * _side_by_side(panels, name)).sum(axis=0)
            for name in COUNTED
        }
        counted = _counted(panels, lambda parts: np.stack(parts).sum(axis=0))
        return cls(grid, **arrays, **_every(cls.pooled, panels), counted=counted)

    @classmethod
    def stack(cls, panels: "Sequence[Panel]") -> "Panel":
        """Panels of one grid as one batch, a new first axis."""
        if len({panel.grid for panel in panels}) != 1:
            raise ValueError("panels on different age grids cannot be stacked; regroup them first")
        arrays: dict[str, Any] = {name: _side_by_side(panels, name) for name in COUNTED}
        counted = _counted(panels, np.stack)
        return cls(panels[0].grid, **arrays, **_every(cls.stack, panels), counted=counted)


COUNTED = ("deaths", "exposure", "infant_weight", "infant_ratio", "births")
BESIDE = ("whole", "standard")


def _side_by_side(panels: "Sequence[Panel]", name: str) -> Array:
    return np.stack([getattr(panel, name) for panel in panels])


def _counted(panels: "Sequence[Panel]", join: Callable[[list[Array]], Array]) -> Array | None:
    """Deaths as counted, joined; None where all are in every panel."""
    if all(panel.counted is None for panel in panels):
        return None
    return join([one.deaths if one.counted is None else one.counted for one in panels])


def _every(join: "Callable[[Sequence[Panel]], Panel]", panels: "Sequence[Panel]") -> dict[str, Any]:
    """What stands beside panels, joined like them: nan where one has none, None where none has."""
    nothing: dict[str, Any] = dict.fromkeys(BESIDE)
    missing = replace(panels[0], **nothing).over(lambda array: np.full_like(array, np.nan))
    others = {name: [getattr(panel, name) for panel in panels] for name in BESIDE}
    return {
        name: None
        if all(one is None for one in found)
        else join([missing if one is None else one for one in found])
        for name, found in others.items()
    }
