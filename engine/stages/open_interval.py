"""What stands above the open age: the open group itself, or a fitted law in single years."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.ages import AgeGrid, Array
from engine.laws import LAWS, LEAST_AGES, Fit, fit
from engine.panel import Panel
from engine.settings import Settings
from engine.stages.rates import Rates, death_rates

LAST_AGE = 130  # the table of a law closes here


@dataclass(frozen=True, slots=True)
class Closed:
    """Rates on the grid of the table; those from position `law_from` on are the law's."""

    grid: AgeGrid
    mx: Array
    law_from: int | None
    borrowed: NDArray[np.bool_]  # whether the open group has the rate of the whole, [...]
    pull: Callable[[Array], Array]  # gradient in these rates -> in the rates of the input grid


def as_delivered(panel: Panel, rates: Rates, settings: Settings) -> Closed:
    """The open group closed by the reciprocal of its rate: its own or, where nobody died in it and
    the settings borrow, that of the whole the population is part of.

    A borrowed rate is taken as known: it does not move with the population's own rates.

    Missing: an open group without deaths keeps its rate of 0 where there is no whole, or none with
             a rate above 0.
    """
    mx, own = rates.mx, rates.mx[..., -1]
    borrowed = (np.real(own) == 0) & settings.borrow
    if panel.whole is None or not borrowed.any():
        return Closed(panel.grid, mx, None, np.zeros_like(borrowed), lambda g: g)
    lent = death_rates(panel.whole.deaths, panel.whole.exposure).mx[..., -1]
    borrowed &= lent > 0
    last = np.where(borrowed, lent, own)[..., None]
    held = borrowed[..., None] & (np.arange(mx.shape[-1]) == mx.shape[-1] - 1)
    return Closed(
        panel.grid,
        np.concatenate([mx[..., :-1], last], axis=-1),
        None,
        borrowed,
        lambda g: np.where(held, 0.0, g),
    )


def by_law(panel: Panel, rates: Rates, settings: Settings) -> Closed:
    """Single years of a law from the open age to 130, each with the hazard at its middle.

    The law is fitted to the closed groups that start at `settings.fit_from` or later, each group's
    rate standing for the hazard at its middle. What was observed in the open group is not used.

    Missing: the law's rates are nan where fewer than three groups with person-years are at hand,
             where no fit is found, and where the fitted rates do not rise with age.
    """
    grid, none = panel.grid, np.zeros(rates.mx.shape[:-1], bool)
    law, closed = LAWS[settings.open_interval], len(grid) - 1
    first = int(np.searchsorted(grid.starts[:closed], settings.fit_from))
    starts = (*grid.starts[:closed], *range(grid.open_age, max(LAST_AGE, grid.open_age) + 1))
    ages = np.arange(grid.open_age, starts[-1] + 1) + 0.5
    if closed - first < LEAST_AGES:
        missing = np.full((*rates.mx.shape[:-1], len(ages)), np.nan)
        mx = np.concatenate([rates.mx[..., :closed], missing], axis=-1)
        return Closed(AgeGrid(starts), mx, closed, none, lambda g: _below(g, closed, np.nan))
    inside = slice(first, closed)
    exposure = np.ascontiguousarray(rates.exposure[..., inside])
    fitted = fit(law, grid.mids[inside], rates.mx[..., inside] * exposure, exposure)
    with np.errstate(all="ignore"):
        rising = np.real(fitted.slope)[..., None] > 0
        above = np.where(rising, fitted.hazard(ages), np.nan)
    mx = np.concatenate([rates.mx[..., :closed], above], axis=-1)
    return Closed(
        AgeGrid(starts), mx, closed, none, lambda g: _pull(g, fitted, ages, inside, closed)
    )


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


OPEN_INTERVALS: dict[str, Callable[[Panel, Rates, Settings], Closed]] = {
    "one_over_m": as_delivered,
    "gompertz": by_law,
    "kannisto": by_law,
}
