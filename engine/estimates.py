"""A figure with its interval, and, where one is missing, the reason."""

from collections.abc import Sequence
from dataclasses import dataclass
from enum import IntEnum
from typing import Any

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array


class Reason(IntEnum):
    """Why a value (or only its interval) is missing. The sentences stand in server/sentences."""

    NONE = 0
    NOT_AVAILABLE = 1  # no data were delivered for this population-year
    NO_POPULATION = 2  # person-years of 0 that no neighbour could be joined with
    NO_DEATHS_IN_OPEN_GROUP = 3
    OPEN_GROUP_TOO_LARGE = 4  # more than the settings' share of births reaches the open group
    TOO_FEW_PERSON_YEARS = 5
    AGE_NOT_ON_GRID = 6
    MODE_AT_EDGE = 7  # the most common age would lie in the open group, or none was found
    NO_DEATHS = 8
    TOO_FEW_AGES = 9  # a law or slope cannot be fitted to fewer than the ages it needs
    NO_SAMPLING_INTERVAL = 10  # a revision: the same deaths counted again
    NOT_SIMULATED = 11  # the indicator has no delta interval, and no stream was given
    WITHHELD = 12
    OFTEN_LOST = 13  # its value stands, but too many simulated tables lack the number
    NO_LAW = 14  # no law that rises with age fits the rates below the open age
    NO_BIRTHS = 15  # births, stillbirths or neonatal deaths were not handed in
    NO_WHOLE = 16  # the area is part of no larger one with rates at every age
    NO_STANDARD = 17  # the population that weights the ages is not held
    TOO_FEW_DEATHS = 18  # fewer than the number needs
    NOT_DECOMPOSED = 19  # no exact share of the difference belongs to an age
    OPEN_AGE_TOO_LOW = 20  # the open group begins too low to be closed by its own death rate
    ACROSS_A_BREAK = 21  # the years added up lie on both sides of a break
    A_STANDARD = 22  # a printed table, in which chance has no part


@dataclass(frozen=True, slots=True)
class Estimate:
    """Value, interval limits and standard error, each of the batch's shape; nan where missing, with
    the reason. Limits may stand without a standard error: none can be told from no deaths."""

    value: Array
    low: Array
    high: Array
    reason: NDArray[np.uint8]
    se: Array

    def __getitem__(self, where: Any) -> "Estimate":
        """Part of the batch."""
        return Estimate(*(np.asarray(getattr(self, name)[where]) for name in self.__slots__))

    @classmethod
    def stack(cls, ones: "Sequence[Estimate]") -> "Estimate":
        """Several as one batch, along a new first axis."""
        parts = ([getattr(one, name) for one in ones] for name in cls.__slots__)
        return cls(*(np.stack(part) for part in parts))

    def within(
        self, low: Array, high: Array, se: Array, why: Reason | NDArray[np.integer[Any]]
    ) -> "Estimate":
        """The value with these limits; `why` is the reason where it stands without them."""
        known, held = np.isfinite(self.value), np.isfinite(low) & np.isfinite(high)
        reason = np.where(known, np.where(held, Reason.NONE, why), self.reason).astype(np.uint8)
        low, high, se = (np.where(known & held, part, np.nan) for part in (low, high, se))
        return Estimate(self.value, low, high, reason, se)

    @classmethod
    def bare(cls, value: Array, reason: NDArray[np.uint8], why: Reason) -> "Estimate":
        """Values where there is no reason against them, without an interval, and why without."""
        stands = reason == Reason.NONE
        value, gap = np.where(stands, value, np.nan), np.full(value.shape, np.nan)
        return cls(value, gap, gap, np.where(stands, np.uint8(why), reason), gap)
