"""Death rates weighted by the people of a standard, and deaths set against those expected."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.ages import AgeGrid, Array
from engine.indicator import Indicator
from engine.panel import Panel
from engine.stages.rates import death_rates
from engine.standards import STANDARDS

LEAST_DEATHS = 10  # under it a standardised rate is not given: common practice
FEW_DEATHS = 20  # under it a standardised rate is flagged: common practice


@dataclass(frozen=True, slots=True)
class Weighted:
    """A mean of death rates, and how each rate moves it."""

    value: Array  # [...]
    gradient: Array  # [..., age], by the rates of the grid they were given on


@dataclass(frozen=True, slots=True)
class Used:
    """What a standardised rate rests on: str(used) is the label to print beside it."""

    standard: str
    groups: int
    top: str  # the open age group

    def __str__(self) -> str:
        return f"{self.standard}, {self.groups} groups, {self.top}"


def direct(grid: AgeGrid, mx: Array, exposure: Array, people: Array, ages: AgeGrid) -> Weighted:
    """The death rate of a standard population that died at the rates of this one: sum of w(x) m(x)
    over sum of w(x), w the people of the standard in each age group.

    Both are first summed, counts and people, into the finest groups they share; so the open group
    is that of whichever begins it earlier, or begins earlier still. A group without person-years
    takes the rate of the one below.

    Shape:   mx, exposure [..., age] on `grid`, people [..., age] on `ages` -> [...], [..., age].
    Missing: nan in, nan out.
    Source:  Breslow & Day (1987), Statistical Methods in Cancer Research II, chapter 2.
    >>> grid, mx, years = AgeGrid((0, 65)), np.array([0.002, 0.05]), np.array([9000.0, 1000.0])
    >>> direct(grid, mx, years, np.array([80.0, 20.0]), grid).value
    array(0.0116)
    """
    shared = grid.common(ages)
    weights = np.ascontiguousarray(ages.regroup(people, shared))
    years = grid.regroup(exposure, shared)
    with np.errstate(all="ignore"):
        weights = weights / weights.sum(axis=-1, keepdims=True)
        rates = death_rates(grid.regroup(mx * exposure, shared), years)
        by_group = rates.pull(np.broadcast_to(weights, rates.mx.shape))
        per_death = np.where(rates.empty, 0.0, by_group / years)
    group = np.searchsorted(shared.starts, grid.starts, side="right") - 1
    value = np.asarray((weights * rates.mx).sum(axis=-1))
    return Weighted(value, per_death[..., group] * exposure)


def crude(grid: AgeGrid, mx: Array, exposure: Array) -> Weighted:
    """The death rate of all ages together: deaths over person-years."""
    return direct(grid, mx, exposure, np.ones(1), AgeGrid((0,)))


def observed_over_expected(mx: Array, exposure: Array, whole: Panel) -> Weighted:
    """Deaths over those expected: sum of m(x) N(x) over sum of M(x) N(x), N person-years, M the
    death rates of the whole, taken as known.

    Shape:   mx, exposure [..., age], the whole on the same grid -> [...], [..., age].
    Missing: nan in, nan out; nan where no deaths are expected.
    Source:  Breslow & Day (1987), Statistical Methods in Cancer Research II, chapter 2.
    """
    expected = expected_deaths(exposure, whole)
    expected = np.where(expected > 0, expected, np.nan)
    observed = (mx * exposure).sum(axis=-1)
    return Weighted(np.asarray(observed / expected), exposure / expected[..., None])


def indirect(mx: Array, exposure: Array, whole: Panel) -> Weighted:
    """The crude death rate of the whole times deaths over those expected at its rates.

    Shape, missing, source: as in `observed_over_expected`.
    """
    ratio = observed_over_expected(mx, exposure, whole)
    rate = np.asarray(whole.deaths.sum(axis=-1) / whole.exposure.sum(axis=-1))
    return Weighted(rate * ratio.value, rate[..., None] * ratio.gradient)


def expected_deaths(exposure: Array, whole: Panel) -> Array:
    """Deaths there would have been at the rates of the whole: sum of M(x) N(x), [...]."""
    reference = death_rates(
        np.ascontiguousarray(whole.deaths), np.ascontiguousarray(whole.exposure)
    )
    return np.asarray((reference.mx * exposure).sum(axis=-1))


def few_deaths(indicator: Indicator, deaths: Array) -> NDArray[np.bool_]:
    """Whether a standardised rate rests on so few deaths that it must be flagged: at least those it
    needs and under 20. Of other indicators never.

    Shape: deaths [..., age] -> [...].
    """
    total = deaths.sum(axis=-1)
    least = indicator.needs.least_deaths
    return np.asarray((least > 0) & (total >= least) & (total < FEW_DEATHS))


def used(indicator: Indicator, grid: AgeGrid) -> Used | None:
    """The standard of a directly standardised rate and the groups it is taken on, for populations
    on this grid; None for any other indicator. A population-year is named by its code.

    >>> from engine.indicators import find
    >>> str(used(find("asr_esp2013"), AgeGrid((0, 1, *range(5, 91, 5)))))
    'European Standard Population 2013, 20 groups, 90+'
    """
    if indicator.needs.standard:
        return Used(indicator.needs.standard, len(grid), grid.labels[-1])
    printed = STANDARDS.get(indicator.key.removeprefix("asr_"))
    if printed is None:
        return None
    shared = grid.common(printed.grid)
    return Used(printed.label, len(shared), shared.labels[-1])
