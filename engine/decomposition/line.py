"""What each age, and each cause in it, contributes along a straight line in the death rates."""

from dataclasses import dataclass

import numpy as np

from engine.ages import Array
from engine.chain import Reading
from engine.decomposition.straight import Line
from engine.panel import Panel
from engine.settings import Settings
from engine.stages.rates import death_rates

ADDS_UP = 1e-6  # relative; so far the causes' deaths may be from all deaths


@dataclass(frozen=True, slots=True)
class Contributions:
    """The difference, this minus that, by age; by_age and remainder add up to it."""

    by_age: Array  # [..., age] on the panels' grid, in the indicator's unit
    remainder: Array  # [...], what no age's rate accounts for
    difference: Array  # [...]


@dataclass(frozen=True, slots=True)
class CauseContributions:
    """The difference, this minus that, by cause and age; all cells and the remainder add up to
    it, and the causes of an age to what the age contributes."""

    by_cause: Array  # [..., cause, age]
    remainder: Array  # [...]
    difference: Array  # [...]


def contributions(
    indicator: Reading, this: Panel, that: Panel, settings: Settings
) -> Contributions:
    """Line integral of the gradient along the straight line between the two columns of raw rates.

    An age's contribution is the integral of d indicator / d mx over that age's own change. The line
    is cut wherever the chain has a kink (the first-year rules change their piece, a group's rate
    reaches the bound of ax) and wherever the open group's rate has doubled, with eight
    Gauss-Legendre nodes to a piece. Where a first-year rule jumps by the rounding of its printed
    coefficients, the jump is age 0's if m0 is what moves it.

    Person-years, births, the infants' mix of sexes and what stands beside the counts change on the
    same line, but are no age's rate: what they move (a fitted law's weights, a crude rate's ages,
    the mean of two first-year rules) is the remainder. Of a table between populations of one sex,
    closed by 1 / m, it is rounding.

    Shape:   panels [..., age] on one grid; batches broadcast.
    Missing: nan where either value is.
    Raises:  ValueError where the grids differ, or the indicator has no derivative.
    Source:  Horiuchi, Wilmoth & Pletcher (2008), Demography 45 (line integral).
    """
    line = Line.between(that, this, settings, indicator)
    difference = line.difference(indicator)
    by_age = cells(line.mean_slope(indicator), line.step[..., None, :], difference)[..., 0, :]
    return Contributions(by_age, difference - by_age.sum(axis=-1), difference)


def contributions_by_cause(
    indicator: Reading,
    this: Panel,
    that: Panel,
    settings: Settings,
    *,
    causes: tuple[Array, Array],
) -> CauseContributions:
    """The contribution of every cause at every age, along the same line.

    On a straight line each cause's rate changes evenly, so that its contribution at an age is the
    mean derivative there times its own change: exact, no proportional share, and whole where one
    cause falls as another rises and the age itself stands still.

    Shape:   `causes` are the deaths of this and of that, [..., cause, age], which add up to all
             deaths; -> [..., cause, age].
    Missing: nan where either value is, and at an age and cause whose deaths are nan.
    Raises:  as `contributions`; ValueError where the causes do not add up to all deaths.
    Source:  Horiuchi, Wilmoth & Pletcher (2008), Demography 45 (line integral, ages and causes).
    """
    line, step = Line.between(that, this, settings, indicator), cause_steps(this, that, causes)
    difference = line.difference(indicator)
    by_cause = cells(line.mean_slope(indicator), step, difference)
    return CauseContributions(by_cause, difference - by_cause.sum(axis=(-2, -1)), difference)


def cells(mean: Array, steps: Array, difference: Array) -> Array:
    """Each cause contributes the mean slope at its age times the change of its rate, where there is
    a difference at all: [..., cause, age]."""
    with np.errstate(all="ignore"):
        return np.where(
            np.isfinite(difference)[..., None, None], mean[..., None, :] * steps, np.nan
        )


def cause_steps(this: Panel, that: Panel, causes: tuple[Array, Array]) -> Array:
    """What each cause's rates change by, this less that, [..., cause, age].

    Raises: ValueError where the causes do not add up to all deaths.
    """
    rates = []
    for panel, deaths in zip((this, that), causes, strict=True):
        require_all(panel, deaths)
        exposure = np.ascontiguousarray(panel.exposure[..., None, :])
        rates.append(death_rates(deaths, exposure).mx)
    return np.asarray(rates[0] - rates[1])


def require_all(panel: Panel, causes: Array) -> None:
    """Refuse causes of death that do not add up to the deaths of the panel."""
    summed, deaths = np.broadcast_arrays(causes.sum(axis=-2), panel.deaths)
    with np.errstate(invalid="ignore"):
        off = np.abs(summed - deaths) > ADDS_UP * np.maximum(1.0, deaths)
    if off.any():
        at = np.unravel_index(int(np.argmax(off)), off.shape)
        raise ValueError(
            f"the causes hold {summed[at]:g} deaths at ages {panel.grid.labels[at[-1]]} "
            f"but all deaths are {deaths[at]:g}; give every death a cause, the unknown one its own"
        )
