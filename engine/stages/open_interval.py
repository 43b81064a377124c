"""What stands above the open age: the open group itself, or a fitted law in single years."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from engine.ages import AgeGrid, Array
from engine.laws import LAWS, LEAST_AGES, Fit, fit
from engine.settings import Settings
from engine.stages.rates import Rates

LAST_AGE = 130  # the table of a law closes here


@dataclass(frozen=True, slots=True)
class Closed:
    """Rates on the grid of the table; those from position `law_from` on are the law's."""

    grid: AgeGrid
    mx: Array
    law_from: int | None
    pull: Callable[[Array], Array]  # gradient in these rates -> in the rates of the input grid


def as_delivered(grid: AgeGrid, rates: Rates, settings: Settings) -> Closed:
    """The open group kept as it is, to be closed by the reciprocal of its rate."""
    return Closed(grid, rates.mx, None, lambda g: g)


def by_law(grid: AgeGrid, rates: Rates, settings: Settings) -> Closed:
    """Single years of a law from the open age to 130, each with the hazard at its middle.

    The law is fitted to the closed groups that start at `settings.fit_from` or later, each group's
    rate standing for the hazard at its middle. What was observed in the open group is not used.

    Missing: the law's rates are nan where fewer than three groups with person-years are at hand,
             where no fit is found, and where the fitted rates do not rise with age.
    """
    law, closed = LAWS[settings.open_interval], len(grid) - 1
    first = int(np.searchsorted(grid.starts[:closed], settings.fit_from))
    starts = (*grid.starts[:closed], *range(grid.open_age, max(LAST_AGE, grid.open_age) + 1))
    ages = np.arange(grid.open_age, starts[-1] + 1) + 0.5
    if closed - first < LEAST_AGES:
        missing = np.full((*rates.mx.shape[:-1], len(ages)), np.nan)
        mx = np.concatenate([rates.mx[..., :closed], missing], axis=-1)
        return Closed(AgeGrid(starts), mx, closed, lambda g: _below(g, closed, np.nan))
    inside = slice(first, closed)
    exposure = np.ascontiguousarray(rates.exposure[..., inside])
    fitted = fit(law, grid.mids[inside], rates.mx[..., inside] * exposure, exposure)
    with np.errstate(all="ignore"):
        rising = np.real(fitted.slope)[..., None] > 0
        above = np.where(rising, fitted.hazard(ages), np.nan)
    mx = np.concatenate([rates.mx[..., :closed], above], axis=-1)
    return Closed(AgeGrid(starts), mx, closed, lambda g: _pull(g, fitted, ages, inside, closed))


def _pull(g: Array, fitted: Fit, ages: Array, inside: slice, closed: int) -> Array:
    with np.errstate(all="ignore"):
        by_law = fitted.pull(ages, g[..., closed:])
    through = np.zeros((*by_law.shape[:-1], closed + 1), by_law.dtype)
    through[..., inside] = by_law
    return _below(g, closed, through)


def _below(g: Array, closed: int, through: Array | float) -> Array:
    """The gradient at the closed groups, and what comes through the law if it is read at all."""
    out = np.concatenate([g[..., :closed], np.zeros_like(g[..., :1])], axis=-1)
    read = (g[..., closed:] != 0).any(axis=-1, keepdims=True)
    return out + np.where(read, through, 0.0)


OPEN_INTERVALS: dict[str, Callable[[AgeGrid, Rates, Settings], Closed]] = {
    "one_over_m": as_delivered,
    "gompertz": by_law,
    "kannisto": by_law,
}
