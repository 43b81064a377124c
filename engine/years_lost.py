"""Years of life lost: what each death is taken to have cost, over the years lived by the living."""

import numpy as np
from numpy.typing import NDArray

from engine.ages import AgeGrid, Array
from engine.standardisation import Weighted
from engine.standards.remaining_years import RemainingYears


def before(grid: AgeGrid, age: int) -> Array:
    """Years from the middle of each group to an exact age, 0 from there on: [age of the grid].

    >>> before(AgeGrid((0, 1, 5, 10)), 10)
    array([9.5, 7. , 2.5, 0. ])
    """
    return np.append(np.maximum(age - grid.mids[:-1], 0.0), 0.0)


def by_reference(grid: AgeGrid, reference: RemainingYears) -> Array:
    """Years left by the reference at the middle of each group, read off on a straight line between
    its ages: [age of the grid].

    Deaths in the open group are put half the reference's remaining years after its start. Against
    single ages of Denmark from 1974 to 2012 that moves all years lost by up to 3 % where the group
    begins at 85, 6 % where at 80, 12 % where at 75.
    """

    def left(ages: Array) -> Array:
        return np.interp(ages, reference.ages, reference.years)

    start = np.array([float(grid.open_age)])
    return left(np.append(grid.mids[:-1], start + left(start) / 2))


def rate(mx: Array, exposure: Array, years: Array, among: NDArray[np.bool_]) -> Weighted:
    """Years lost for each year lived: sum of y(x) m(x) N(x) over sum of N(x) among the ages asked,
    y the years that a death costs, N person-years.

    Shape:   mx, exposure, years, among (whether an age is asked) [..., age] -> [...], [..., age].
    Missing: nan in, nan out.
    Source:  Romeder & McWhinnie (1977), Potential years of life lost between ages 1 and 70,
             International Journal of Epidemiology 6, 143-151.
    >>> mx, lived = np.array([0.001, 0.02]), np.array([9000.0, 1000.0])
    >>> rate(mx, lived, np.array([40.0, 0.0]), np.array([True, False])).value
    array(0.04)
    """
    lived = np.where(among, exposure, 0.0)
    with np.errstate(all="ignore"):
        gradient = years * lived / lived.sum(axis=-1, keepdims=True)
    return Weighted(np.asarray((gradient * mx).sum(axis=-1)), gradient)
