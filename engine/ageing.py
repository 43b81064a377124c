"""How fast death rates rise with age: the slope over a span, and step by step."""

from dataclasses import dataclass

import numpy as np
from scipy.special import betaincinv

from engine.ages import AgeGrid, Array
from engine.panel import Panel

STEPS = 40  # Newton's double the digits; so many leave room for those held back


@dataclass(frozen=True, slots=True)
class Slope:
    """Slope of log rates on age, per year of age, and its gradient in the rates."""

    value: Array  # [...]
    gradient: Array  # [..., age], 0 outside the span


def within(grid: AgeGrid, span: tuple[int, int]) -> slice:
    """The closed groups that lie wholly in a span of completed years, both ends counted.

    >>> AgeGrid((0, 40, 45, 50)).labels[within(AgeGrid((0, 40, 45, 50)), (40, 49))]
    ('40–44', '45–49')
    """
    ends = grid.starts[1:]
    first = sum(start < span[0] for start in grid.starts)
    return slice(first, max(first, sum(end <= span[1] + 1 for end in ends)))


def slope(grid: AgeGrid, mx: Array, exposure: Array, span: tuple[int, int]) -> Slope:
    """Poisson slope of log rates: b in log mu = a + b x, x the middle of the group.

    Maximum likelihood for deaths mx * exposure given the person-years E. For a given b the level a
    has a closed form; what is left to solve is that the mean age at death observed equals the one
    expected, sum E x exp(bx) / sum E exp(bx). The gradient is the implicit function theorem's.

    Shape:   mx, exposure [..., age] -> [...] and [..., age]; complex mx allowed.
    Missing: nan where deaths lie in fewer than two groups of the span, where it holds fewer than
             three groups, or where a rate or the person-years are nan.
    Source:  Horiuchi & Coale (1990), Mathematical Population Studies 2 (the rate); Brillinger
             (1986), Biometrics 42 (deaths Poisson given the person-years).
    """
    inside = within(grid, span)
    gradient = np.zeros(np.broadcast_shapes(mx.shape, exposure.shape), mx.dtype)
    if inside.stop - inside.start < 3:
        return Slope(np.full(gradient.shape[:-1], np.nan), np.full(gradient.shape, np.nan))
    years = exposure[..., inside]
    deaths = mx[..., inside] * years
    total = deaths.sum(axis=-1)
    centre = grid.mids[inside].mean()
    x = grid.mids[inside] - centre
    with np.errstate(all="ignore"):
        observed = (deaths * x).sum(axis=-1) / total
        b = np.full(total.shape, 0.1, mx.dtype)
        for _ in range(STEPS):
            weight = years * np.exp(b[..., None] * x)
            share = weight / weight.sum(axis=-1, keepdims=True)
            mean = (share * x).sum(axis=-1)
            spread = (share * (x - mean[..., None]) ** 2).sum(axis=-1)
            step = (observed - mean) / spread
            b = b + np.where(np.abs(np.real(step)) > 0.1, 0.1 * np.sign(np.real(step)), step)
        found = (np.sum(np.real(deaths) > 0, axis=-1) > 1) & (np.abs(np.real(step)) < 1e-9)
        gradient[..., inside] = years * (x - mean[..., None]) / (total * spread)[..., None]
    return Slope(np.where(found, b, np.nan), np.where(found[..., None], gradient, np.nan))


@dataclass(frozen=True, slots=True)
class Rises:
    """Rise of death rates between neighbouring age groups, k, at the age where they meet."""

    at: Array  # [k], ages
    value: Array  # [..., k], per year of age
    low: Array
    high: Array


def rises(panel: Panel, least_deaths: float = 100, width: int = 5, level: float = 0.95) -> Rises:
    """Life-table ageing rate between neighbours: k = log(m above / m below) / width.

    Groups are first summed to the starts that are multiples of `width`; pairs of that width only.
    Given the deaths of both groups together, those above are binomial, so the exact limits of that
    share (Clopper & Pearson) give exact limits of the ratio of rates, and of k. Of deaths that were
    shared out, those counted are binomial, and the ratio is scaled by what they are worth.

    Shape:   panel [..., age] -> `at` [k], the others [..., k].
    Missing: nan where either group has fewer than `least_deaths` deaths, or no person-years.
    Source:  Horiuchi & Coale (1990), Mathematical Population Studies 2 (the rate between groups);
             Clopper & Pearson (1934), Biometrika 26; Przyborowski & Wilenski (1940), Biometrika 31
             (the ratio of two Poisson means).
    """
    grid = AgeGrid(tuple(start for start in panel.grid.starts if start % width == 0))
    panel = panel.regroup(grid)
    pairs = np.flatnonzero((grid.widths[:-1] == width) & (grid.widths[1:] == width))
    below, above = panel.counts[..., pairs], panel.counts[..., pairs + 1]
    with np.errstate(all="ignore"):
        odds = panel.exposure[..., pairs] / panel.exposure[..., pairs + 1]
        if (worth := panel.worth) is not None:
            odds = odds * worth[..., pairs + 1] / worth[..., pairs]
        enough = (below >= least_deaths) & (above >= least_deaths) & np.isfinite(odds) & (odds > 0)
        tail = (1 - level) / 2
        low = betaincinv(above, below + 1, tail)
        high = betaincinv(above + 1, below, 1 - tail)
        k = (
            np.where(enough, np.log(ratio * odds) / width, np.nan)
            for ratio in (above / below, low / (1 - low), high / (1 - high))
        )
        return Rises(np.array(grid.starts, float)[pairs + 1], *k)
