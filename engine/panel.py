"""Deaths and person-years of many populations on one age grid."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from engine.ages import AgeGrid, Array

SEXES = ("f", "m", "p")  # women, men, persons


@dataclass(frozen=True, slots=True)
class Panel:
    """Counts [..., age] on one grid, and what the first-year rule must know of the sexes.

    Women and men have rules of their own for the first year of life. A table for persons takes the
    mean of the two, weighted by infant deaths, so a panel carries for women and men (last axis, in
    this order) their share of the infant deaths and their infant death rate over that of the table.
    """

    grid: AgeGrid
    deaths: Array  # [..., age]
    exposure: Array  # [..., age], person-years
    infant_weight: Array  # [..., 2]
    infant_ratio: Array  # [..., 2]

    def __post_init__(self) -> None:
        for name in ("deaths", "exposure"):
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

    def __getitem__(self, where: object) -> "Panel":
        """Part of the batch; `where` indexes the leading axes only."""
        return replace(
            self,
            **{
                name: getattr(self, name)[where]
                for name in ("deaths", "exposure", "infant_weight", "infant_ratio")
            },
        )

    def regroup(self, to: AgeGrid) -> "Panel":
        """The same populations on a coarser grid, exactly."""
        return replace(
            self,
            grid=to,
            deaths=self.grid.regroup(self.deaths, to),
            exposure=self.grid.regroup(self.exposure, to),
        )

    @classmethod
    def of(cls, grid: AgeGrid, deaths: Array, exposure: Array, *, sex: str) -> "Panel":
        """One sex ('f' or 'm'), or persons ('p') of whom the sexes are not known: then the plain
        mean of the two first-year rules is taken."""
        weight = {"f": (1.0, 0.0), "m": (0.0, 1.0), "p": (0.5, 0.5)}[sex]
        batch = (*deaths.shape[:-1], 2)
        return cls(
            grid, deaths, exposure, np.broadcast_to(np.array(weight), batch).copy(), np.ones(batch)
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
        return cls(grid, deaths, exposure, weight, np.where(np.isfinite(ratio), ratio, 1.0))

    @classmethod
    def stack(cls, panels: "Sequence[Panel]") -> "Panel":
        """Panels of one grid as one batch, a new first axis."""
        if len({panel.grid for panel in panels}) != 1:
            raise ValueError("panels on different age grids cannot be stacked; regroup them first")
        return cls(
            panels[0].grid,
            *(
                np.stack([getattr(panel, name) for panel in panels])
                for name in ("deaths", "exposure", "infant_weight", "infant_ratio")
            ),
        )
