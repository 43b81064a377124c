"""Death rates of probabilities of dying."""

import numpy as np

from engine.ages import AgeGrid, Array

FROM, FEWEST = 60, 3  # age, and closed groups from it on, that the rate of the open group rests on
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(64)
_YEARS = 60.0  # lived at most beyond the start of the open group


def death_rates(probabilities: Array, grid: AgeGrid) -> Array:
    """m = q / (n (1 - q / 2)) in closed groups: those who die in one of n years live half of it. Of
    the open group, in which all die, the rate that Gompertz's law gives.

    Shape:   [..., age] -> [..., age].
    Missing: nan for the open group where the rates below it do not follow the law.
    Source:  Preston, Heuveline & Guillot (2001), Demography, ch. 3 (with a = n / 2).
    >>> death_rates(np.array([0.01, 0.2, 1.0]), AgeGrid((0, 1, 5)))
    array([0.01005025, 0.05555556,        nan])
    """
    mx = np.full(probabilities.shape, np.nan)
    closed = probabilities[..., :-1]
    mx[..., :-1] = closed / (grid.widths[:-1] * (1 - closed / 2))
    mx[..., -1] = open_rates(mx, grid)
    return mx


def open_rates(mx: Array, grid: AgeGrid) -> Array:
    """Death rate of the open group of a population that stays as it is, 1 / e: the logarithms of
    the rates from age 60 on are laid on a line (least squares), and the line goes on.

    Of Danish women and men, 1974 to 2012, open at 80 to 90, it is off by 5 % on average.
    Shape:   mx [..., age] -> [...]; its last column is not looked at.
    Missing: nan with fewer than three closed groups from 60 on, a rate of 0 or a gap among them, or
             rates that do not rise.
    Source:  Gompertz (1825), Philosophical Transactions of the Royal Society 115.
    """
    use = np.array(grid.starts[:-1]) >= FROM
    if use.sum() < FEWEST:
        return np.full(mx.shape[:-1], np.nan)
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        logs = np.log(mx[..., :-1][..., use])
        before = grid.mids[:-1][use] - grid.open_age
        around = before - before.mean()
        slope = (logs * around).sum(axis=-1) / (around**2).sum()
        start = np.exp(logs.mean(axis=-1) - slope * before.mean())
        years = _YEARS / 2 * (_NODES + 1)
        hazard = (start / slope)[..., None] * np.expm1(slope[..., None] * years)
        expectancy = (np.exp(-hazard) * _WEIGHTS).sum(axis=-1) * _YEARS / 2
        return np.where(slope > 0, 1 / expectancy, np.nan)
