"""Deaths by cause beside the deaths of a panel."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from engine.ages import AgeGrid, Array
from engine.panel import Panel


@dataclass(frozen=True, slots=True)
class CauseCounts:
    """Deaths of every cause, on the grid of the panel whose deaths they add up to.

    `counted` are those that were counted under the cause, where `deaths` hold others that were
    shared out among the causes: chance is in the deaths counted.
    """

    deaths: Array  # [..., cause, age]
    counted: Array | None = None  # [..., cause, age]; None: all deaths

    def over(self, change: Callable[[Array], Array]) -> "CauseCounts":
        """Both arrays changed alike."""
        return CauseCounts(
            change(self.deaths), None if self.counted is None else change(self.counted)
        )

    def regroup(self, grid: AgeGrid, to: AgeGrid) -> "CauseCounts":
        """The same counts on a coarser grid, exactly."""
        return self.over(lambda array: grid.regroup(array, to))

    @property
    def counts(self) -> Array:
        """Deaths in which chance is, [..., cause, age]; as `Panel.counts`."""
        if self.counted is None:
            return self.deaths
        return np.where((self.counted > 0) | np.isnan(self.deaths), self.counted, self.deaths)

    @property
    def worth(self) -> Array:
        """Deaths that each one counted stands for, [..., cause, age]; as `Panel.worth`."""
        if self.counted is None:
            return np.ones(self.deaths.shape)
        with np.errstate(divide="ignore", invalid="ignore"):
            together = self.deaths.sum(axis=-1) / self.counts.sum(axis=-1)
            usual = np.where(np.isfinite(together), together, 1.0)[..., None]
            return np.where(self.counts > 0, self.deaths / self.counts, usual)

    def shares(self, panel: Panel) -> Array:
        """Share of each cause in the deaths at its age, [..., cause, age]; where nobody died, that
        of the cause in all deaths together."""
        with np.errstate(divide="ignore", invalid="ignore"):
            own = self.deaths / panel.deaths[..., None, :]
            together = self.deaths.sum(axis=-1) / panel.deaths.sum(axis=-1)[..., None]
        return np.where(panel.deaths[..., None, :] > 0, own, together[..., None])
