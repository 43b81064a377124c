"""ax: the years lived in an age group by those who die in it, as a function of the rates."""

from dataclasses import dataclass

import numpy as np

from engine.ages import AgeGrid, Array
from engine.settings import Settings
from engine.stages.inside import INSIDE, Lived, Neighbours, constant_rate, iterate
from engine.stages.open_interval import Closed

Pieces = tuple[tuple[float, float, float], ...]  # (infant rate from which, intercept, slope)

# Andreev & Kingkade (2015), Demographic Research 33(13), table of the average age at death in
# infancy from the infant death rate. Women, then men, as in Panel.
ANDREEV_KINGKADE: tuple[Pieces, Pieces] = (
    ((0.0, 0.14903, -2.05527), (0.01724, 0.04667, 3.88089), (0.06891, 0.31411, 0.0)),
    ((0.0, 0.14929, -1.99545), (0.02300, 0.02832, 3.26021), (0.08307, 0.29915, 0.0)),
)
# Coale & Demeny (1983), West, as printed in Preston, Heuveline & Guillot (2001), table 3.3. At the
# break of 0.107 a0 steps down, by 0.0026 of a year (women) and 0.0022 (men), and a(1-4) up, by
# 0.0014 and 0.0023; the slopes fall to 0; at the break itself the piece above it holds.
COALE_DEMENY_FIRST: tuple[Pieces, Pieces] = (
    ((0.0, 0.053, 2.8), (0.107, 0.35, 0.0)),
    ((0.0, 0.045, 2.684), (0.107, 0.33, 0.0)),
)
COALE_DEMENY: tuple[Pieces, Pieces] = (
    ((0.0, 1.522, -1.518), (0.107, 1.361, 0.0)),
    ((0.0, 1.651, -2.816), (0.107, 1.352, 0.0)),
)
HALF_A_YEAR: tuple[Pieces, Pieces] = (((0.0, 0.5, 0.0),), ((0.0, 0.5, 0.0),))
TWO_YEARS: tuple[Pieces, Pieces] = (((0.0, 2.0, 0.0),), ((0.0, 2.0, 0.0),))
CONSTANT_RATE: tuple[Pieces, Pieces] = ((), ())  # not read off the infant rate, and broken nowhere

FIRST_YEAR = {
    "andreev_kingkade": ANDREEV_KINGKADE,
    "coale_demeny": COALE_DEMENY_FIRST,
    "midpoint": HALF_A_YEAR,
    "constant_rate": CONSTANT_RATE,
}
CHILD = {"coale_demeny": COALE_DEMENY, "midpoint": TWO_YEARS, "constant_rate": CONSTANT_RATE}


@dataclass(frozen=True, slots=True)
class Separation:
    """ax [..., age] and its slopes, for the pullback."""

    ax: Array
    own: Array  # d ax / d mx of the same group
    child: Array | None  # d a(1-4) / d m0, where it is not capped
    neighbours: Neighbours | None  # groups whose ax the groups beside them move

    def pull(self, g: Array) -> Array:
        """Gradient in mx from the gradient in ax."""
        with np.errstate(invalid="ignore"):
            out = np.where(g == 0, 0.0, g * self.own)
        if self.child is not None:
            out[..., 0] += g[..., 1] * self.child
        if self.neighbours is not None:
            out[..., :-1] += self.neighbours.pull(g[..., :-1])
        return out


def separate(closed: Closed, weight: Array, ratio: Array, settings: Settings) -> Separation:
    """ax of every group.

    First year of life, where it is a group: the rule of each sex at that sex's infant rate
    (ratio * m0), weighted. Ages 1-4, where they are a group: the rule for them, also from m0.
    Otherwise the settings' rule for the inside of groups; 1 / m in the open group; in the single
    years of a law the rate is constant within the year.

    A group cannot lose more than enter it: where ax would make qx pass 1 (ax mx > 1), ax = 1 / mx
    and qx = 1, so that the table still has the rate that was observed.

    Shape:   weight, ratio [..., 2], women and men; -> [..., age].
    Missing: an open group without deaths has no 1 / m: nan.
    Source:  Andreev & Kingkade (2015); Coale & Demeny (1983); those of engine/stages/inside.py.
    """
    n, m, last = closed.grid.widths[:-1], closed.mx[..., :-1], closed.mx[..., -1:]
    lived, child = _by_rule(closed, weight, ratio, settings)
    with np.errstate(all="ignore"):
        full, empty = np.real(lived.ax) * np.real(m) > 1, np.real(last) == 0
        ax, own = np.where(full, 1 / m, lived.ax), np.where(full, -1 / m**2, lived.slope)
        above, slope = (np.where(empty, np.nan, part) for part in (1 / last, -1 / last**2))
    if child is not None:
        child = np.where(full[..., 1], 0.0, child)
    neighbours = iterate(n, m, Lived(ax, own)) if settings.inside == "keyfitz" else None
    if neighbours is not None:
        ax, own = neighbours.ax, neighbours.own
    ax, own = (np.concatenate(part, axis=-1) for part in ((ax, above), (own, slope)))
    return Separation(ax, own, child, neighbours)


def has_first_year(grid: AgeGrid) -> bool:
    return grid.starts[:2] == (0, 1)


def has_child_group(grid: AgeGrid) -> bool:
    return grid.starts[:3] == (0, 1, 5)


def _by_rule(
    closed: Closed, weight: Array, ratio: Array, settings: Settings
) -> tuple[Lived, Array | None]:
    """ax of the closed groups as the rules have it, before any bound, with its slope in the own
    rate; and the slope of a(1-4) in m0 where it is read off that."""
    grid, m, child = closed.grid, closed.mx[..., :-1], None
    n = grid.widths[:-1]
    inside = INSIDE[settings.inside](n, m)
    ax, own = inside.ax, inside.slope
    if closed.law_from is not None:
        within = slice(closed.law_from, None)
        steady = constant_rate(n[within], m[..., within])
        ax[..., within], own[..., within] = steady.ax, steady.slope
    if has_first_year(grid):
        first = _early(FIRST_YEAR[settings.first_year], n[0], m[..., 0], m[..., 0], weight, ratio)
        ax[..., 0], own[..., 0] = first.ax, first.slope
    if has_child_group(grid):
        rule = CHILD[settings.child]
        found = _early(rule, n[1], m[..., 1], m[..., 0], weight, ratio)
        ax[..., 1] = found.ax
        own[..., 1], child = (found.slope, None) if rule is CONSTANT_RATE else (0.0, found.slope)
    return Lived(ax, own), child


def _early(
    rule: tuple[Pieces, Pieces], n: float, m: Array, m0: Array, weight: Array, ratio: Array
) -> Lived:
    """A group of the first years: of a constant rate, with the slope in its own rate, or by the
    infant rate, with the slope in that."""
    if rule is CONSTANT_RATE:
        return constant_rate(n, m)
    return by_infant_rate(rule, m0, weight, ratio)


def by_infant_rate(rules: tuple[Pieces, Pieces], m0: Array, weight: Array, ratio: Array) -> Lived:
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
    return Lived(value, slope)
