"""Counts to death rates; an age group without person-years is joined with the one below it."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array


@dataclass(frozen=True, slots=True)
class Rates:
    """Raw rates on the input grid and the counts behind them, each [..., age]."""

    mx: Array  # joined groups carry the rate of the whole join
    deaths: Array
    exposure: Array
    empty: NDArray[np.bool_]  # takes the rate of the join with the group below

    @property
    def joined(self) -> NDArray[np.bool_]:
        """Whether a group shares its rate with a neighbour, [..., age]."""
        shares = self.empty.copy()
        shares[..., :-1] |= self.empty[..., 1:]
        return shares & ~np.isnan(self.mx)

    def pull(self, g: Array) -> Array:
        """Gradient in the raw rates from the gradient in the joined ones: a join's parts add up in
        its lowest group, which owns the person-years."""
        g = g.copy()
        for x in reversed(range(1, g.shape[-1])):
            g[..., x - 1] += np.where(self.empty[..., x], g[..., x], 0.0)
            g[..., x] = np.where(self.empty[..., x], 0.0, g[..., x])
        return g

    def per_death(self, g: Array) -> Array:
        """What one death more at each age moves, from the gradient in the raw rates: deaths of a
        join all count in the rate of its lowest group."""
        with np.errstate(divide="ignore", invalid="ignore"):
            moved = g / self.exposure
        for x in range(1, moved.shape[-1]):
            moved[..., x] = np.where(self.empty[..., x], moved[..., x - 1], moved[..., x])
        return moved


def death_rates(deaths: Array, exposure: Array) -> Rates:
    """Central death rates, mx = deaths / exposure.

    Shape:   deaths, exposure [..., age].
    Missing: nan in, nan out. Exposure of 0 takes the rate of the join with the group below (and
             with what that one is joined with); at age 0, which has none below, nan.
    Source:  Preston, Heuveline & Guillot (2001), Demography, ch. 3.
    >>> death_rates(np.array([3.0, 8.0, 2.0]), np.array([1000.0, 400.0, 0.0])).mx
    array([0.003, 0.025, 0.025])
    """
    empty = exposure == 0
    if not empty.any():  # the usual case: nothing to join
        return Rates(deaths / exposure, deaths, exposure, empty)
    pooled = np.array(deaths, dtype=np.result_type(deaths, float))
    with np.errstate(divide="ignore", invalid="ignore"):
        for x in reversed(range(1, pooled.shape[-1])):
            pooled[..., x - 1] += np.where(empty[..., x], pooled[..., x], 0.0)
        mx = np.where(empty, np.nan, pooled / exposure)
    for x in range(1, mx.shape[-1]):
        mx[..., x] = np.where(empty[..., x], mx[..., x - 1], mx[..., x])
    return Rates(mx, deaths, exposure, empty)


def given_rates(mx: Array, exposure: Array) -> Rates:
    """Rates given outright, each group for itself; the deaths are those the exposure implies."""
    return Rates(mx, mx * exposure, exposure, np.zeros(mx.shape, dtype=bool))
