"""Contributions to a change over many years, along the path that rates took through all of them."""

from dataclasses import dataclass

import numpy as np

from engine.ages import Array
from engine.chain import Reading
from engine.decomposition.line import Contributions, contributions, contributions_by_cause
from engine.panel import Panel
from engine.settings import Settings


@dataclass(frozen=True, slots=True)
class Path:
    """The change from the first to the last of many years, by age; steps and remainders of a path
    add up to the difference, and so do those of the straight line from end to end."""

    by_step: Array  # [step, ..., age]
    remainder: Array  # [step, ...]
    straight: Contributions  # from the first year to the last at once

    @property
    def by_age(self) -> Array:
        """The contributions along the path, [..., age]."""
        return np.asarray(self.by_step.sum(axis=0))

    @property
    def apart(self) -> Array:
        """By how much the path's contribution of an age exceeds the straight line's, [..., age]."""
        return self.by_age - self.straight.by_age


def along(indicator: Reading, years: Panel, settings: Settings) -> Path:
    """Line integral of the gradient along the straight lines from each year to the next.

    The total is the same as between the end points, but the ages' shares need not be: what an age
    contributes depends on the rates of the others while it changes. The path follows the years as
    they were, with their chance from year to year; between end points every age changes evenly.

    Shape:   years [year, ..., age], in order -> [year - 1, ..., age].
    Missing: a year without a value leaves the steps to and from it, and the path's sum, nan.
    Raises:  as `contributions`; ValueError where there are fewer than two years.
    Source:  Horiuchi, Wilmoth & Pletcher (2008), Demography 45, 785-801.
    """
    if not years.batch_shape or years.batch_shape[0] < 2:
        raise ValueError("a path needs at least two years; put years on the first axis")
    steps = contributions(indicator, years[1:], years[:-1], settings)
    straight = contributions(indicator, years[-1], years[0], settings)
    return Path(steps.by_age, steps.remainder, straight)


def along_by_cause(indicator: Reading, years: Panel, settings: Settings, *, causes: Array) -> Array:
    """The contribution of every cause at every age along the same path: the steps summed.

    Shape:   years [year, ..., age], causes [year, ..., cause, age] -> [..., cause, age].
    Missing, raises, source: as `along` and `contributions_by_cause`.
    """
    if not years.batch_shape or years.batch_shape[0] < 2:
        raise ValueError("a path needs at least two years; put years on the first axis")
    steps = contributions_by_cause(
        indicator, years[1:], years[:-1], settings, causes=(causes[1:], causes[:-1])
    )
    return np.asarray(steps.by_cause.sum(axis=0))
