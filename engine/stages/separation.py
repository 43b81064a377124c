"""ax: the years lived in an age group by those who die in it, as a function of the rates."""

from dataclasses import dataclass

import numpy as np

from engine.ages import AgeGrid, Array
from engine.settings import Settings
from engine.stages.open_interval import Closed

Pieces = tuple[tuple[float, float, float], ...]  # (infant rate from which, intercept, slope)

# Andreev & Kingkade (2015), Demographic Research 33(13), table of the average age at death in
# infancy from the infant death rate. Women, then men, as in Panel.
ANDREEV_KINGKADE: tuple[Pieces, Pieces] = (
    ((0.0, 0.14903, -2.05527), (0.01724, 0.04667, 3.88089), (0.06891, 0.31411, 0.0)),
    ((0.0, 0.14929, -1.99545), (0.02300, 0.02832, 3.26021), (0.08307, 0.29915, 0.0)),
)
# Coale & Demeny (1983), West, as printed in Preston, Heuveline & Guillot (2001), table 3.3.
COALE_DEMENY: tuple[Pieces, Pieces] = (
    ((0.0, 1.522, -1.518), (0.107, 1.361, 0.0)),
    ((0.0, 1.651, -2.816), (0.107, 1.352, 0.0)),
)
FIRST_YEAR = {"andreev_kingkade": ANDREEV_KINGKADE}
CHILD = {"coale_demeny": COALE_DEMENY}


@dataclass(frozen=True, slots=True)
class Separation:
    """ax [..., age] and its slopes, for the pullback."""

    ax: Array
    own: Array  # d ax / d mx of the same group
    child: Array | None  # d a(1-4) / d m0, where it is not capped

    def pull(self, g: Array) -> Array:
        """Gradient in mx from the gradient in ax."""
        with np.errstate(invalid="ignore"):
            out = np.where(g == 0, 0.0, g * self.own)
        if self.child is not None:
            out[..., 0] += g[..., 1] * self.child
        return out


def separate(closed: Closed, weight: Array, ratio: Array, settings: Settings) -> Separation:
    """ax of every group.

    First year of life, where it is a group: the rule of each sex at that sex's infant rate
    (ratio * m0), weighted. Ages 1-4, where they are a group: the rule for them, also from m0.
    Otherwise half the width; 1 / m in the open group; in the single years of a law the rate is
    constant within the year, ax = 1 / m - n / (exp(n m) - 1).

    A group cannot lose more than enter it: where ax would make qx pass 1 (ax mx > 1), ax = 1 / mx
    and qx = 1, so that the table still has the rate that was observed.

    Shape:   weight, ratio [..., 2], women and men; -> [..., age].
    Missing: an open group without deaths has no 1 / m: nan.
    Source:  Andreev & Kingkade (2015); Coale & Demeny (1983).
    """
    grid, mx, n = closed.grid, closed.mx, closed.grid.widths
    ax = np.broadcast_to(np.append(n[:-1] / 2, np.nan), mx.shape).astype(mx.dtype)
    own, child = np.zeros_like(ax), None
    if closed.law_from is not None:
        within = slice(closed.law_from, -1)
        ax[..., within], own[..., within] = _constant_rate(n[within], mx[..., within])
    if has_first_year(grid):
        pieces = FIRST_YEAR[settings.first_year]
        ax[..., 0], own[..., 0] = _by_infant_rate(pieces, mx[..., 0], weight, ratio)
    if has_child_group(grid):
        pieces = CHILD[settings.child]
        ax[..., 1], child = _by_infant_rate(pieces, mx[..., 0], weight, ratio)
    with np.errstate(all="ignore"):
        full = np.real(ax) * np.real(mx) > 1
        full[..., -1] = True
        empty = np.real(mx) == 0
        ax = np.where(full, np.where(empty, np.nan, 1 / mx), ax)
        own = np.where(full, np.where(empty, np.nan, -1 / mx**2), own)
    if child is not None:
        child = np.where(full[..., 1], 0.0, child)
    return Separation(ax, own, child)


def has_first_year(grid: AgeGrid) -> bool:
    return grid.starts[:2] == (0, 1)


def has_child_group(grid: AgeGrid) -> bool:
    return grid.starts[:3] == (0, 1, 5)


def _by_infant_rate(
    rules: tuple[Pieces, Pieces], m0: Array, weight: Array, ratio: Array
) -> tuple[Array, Array]:
    """Mean of the sexes' rules and its derivative in m0."""
    value, slope = np.zeros_like(m0), np.zeros_like(m0)
    for sex, pieces in enumerate(rules):
        w, r = weight[..., sex], ratio[..., sex]
        rate = r * m0
        for start, intercept, gradient in pieces:
            if start == 0:
                here, bend = intercept + gradient * rate, np.full_like(rate, gradient)
            else:
                above = np.real(rate) >= start
                here = np.where(above, intercept + gradient * rate, here)
                bend = np.where(above, gradient, bend)
        value, slope = value + w * here, slope + w * r * bend
    return value, slope


def _constant_rate(n: Array, m: Array) -> tuple[Array, Array]:
    """ax and its derivative where the rate is constant within the group."""
    y = n * m
    with np.errstate(all="ignore"):
        odds = 1 / np.expm1(y)
        share, slope = 1 / y - odds, odds * (1 + odds) - 1 / y**2
        # near 0 the difference of the two cancels; this is its power series
        near = np.abs(y) < 0.1
        y2 = y * y
        series = 0.5 - y / 12 * (1 - y2 / 60 * (1 - y2 / 42 * (1 - y2 / 40)))
        bend = -1 / 12 + y2 / 240 * (1 - y2 / 25.2 * (1 - y2 * 7 / 200))
    return n * np.where(near, series, share), n * n * np.where(near, bend, slope)
