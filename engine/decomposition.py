"""What each age contributes to the difference of an indicator between two populations."""

from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.ages import AgeGrid, Array
from engine.chain import Chain, Reading, gradient, run
from engine.panel import Panel
from engine.settings import Settings
from engine.stages.separation import CHILD, FIRST_YEAR, has_child_group, has_first_year
from engine.streams import pair_draws
from engine.tables import LifeTable
from engine.uncertainty import quantiles

NODES, WEIGHTS = np.polynomial.legendre.leggauss(8)
BESIDE = 1e-13  # relative distance at which the two sides of a jump are read
DOUBLINGS = 8  # cuts as the open group's rate doubles: 1 / m bends too sharply for eight nodes


@dataclass(frozen=True, slots=True)
class Contributions:
    """The difference, this minus that, by age; by_age and remainder add up to it."""

    by_age: Array  # [..., age] on the panels' grid, in the indicator's unit
    remainder: Array  # [...], what no age's rate accounts for
    difference: Array  # [...]


class Limits(NamedTuple):
    low: Array
    high: Array


def contributions(
    indicator: Reading, this: Panel, that: Panel, settings: Settings
) -> Contributions:
    """Line integral of the gradient along the straight line between the two columns of raw rates.

    An age's contribution is the integral of d indicator / d mx over that age's own change. The line
    is cut wherever the chain has a kink (the first-year rules change their piece, a group's rate
    reaches the bound of ax) and wherever the open group's rate has doubled, with eight
    Gauss-Legendre nodes to a piece. Where a first-year rule jumps by the rounding of its printed
    coefficients, the jump is age 0's if m0 is what moves it.

    Person-years and the infants' mix of sexes change on the same line, but are no age's rate: what
    they move (a fitted law's weights, the mean of two first-year rules) is the remainder. Between
    populations of one sex, closed by 1 / m, it is rounding.

    Shape:   panels [..., age] on one grid; batches broadcast.
    Missing: nan where either value is.
    Raises:  ValueError where the grids differ, or the indicator has no derivative.
    Source:  Horiuchi, Wilmoth & Pletcher (2008), Demography 45 (line integral).
    """
    if this.grid != that.grid:
        raise ValueError(
            f"the age groups differ ({this.grid.code} and {that.grid.code}); "
            "regroup both to their common grid first"
        )
    upper, lower = run(this, settings), run(that, settings)
    difference = np.asarray(indicator.value(upper) - indicator.value(lower))
    line = _Line(that, this, *np.broadcast_arrays(lower.rates.mx, upper.rates.mx))
    cuts = line.cuts(settings)
    one = np.ones((1, *cuts.at.shape[1:]))
    nodes, weights = _gauss(np.concatenate([0 * one, cuts.at, one]))
    slopes = gradient(indicator, line.at(nodes, settings))
    with np.errstate(all="ignore"):
        parts = np.where(weights[..., None] > 0, weights[..., None] * slopes, 0.0)
        by_age = parts.sum(axis=0) * line.step
        by_age[..., 0] += line.jumps(indicator, cuts, settings)
        by_age = np.where(np.isfinite(difference)[..., None], by_age, np.nan)
        remainder = difference - by_age.sum(axis=-1)
    return Contributions(by_age, remainder, difference)


def contribution_limits(
    indicator: Reading,
    this: Panel,
    that: Panel,
    settings: Settings,
    *,
    streams: tuple[NDArray[np.str_], NDArray[np.str_]],
    shared: Array | None = None,
    draws: int = 200,
    groups: AgeGrid | None = None,
) -> Limits:
    """Limits within which chance in deaths leaves each age's contribution, by keyed simulation.

    Deaths of both populations are drawn anew, those counted in both (`shared`) once, person-years
    and the infants' mix held; the limits are quantiles over the draws at the settings' level. With
    `groups`, a coarser grid, they are limits of the sums over its groups.

    Shape:   panels of one shape, shared [..., age], streams of this and of that [...]
             -> low, high [..., age], or [..., group].
    Missing: nan where more than 1 % of the draws give no figure.
    Raises:  as `contributions` and `poisson_draws`.
    """
    both = np.zeros_like(this.deaths) if shared is None else shared
    drawn = pair_draws(this.deaths, that.deaths, both, streams, draws, "contributions")
    this, that = replace(this, deaths=drawn.this), replace(that, deaths=drawn.that)
    by_age = contributions(indicator, this, that, settings).by_age
    if groups is not None:
        by_age = this.grid.regroup(by_age, groups)
    limits = quantiles(by_age.reshape(draws, -1), settings.level).reshape(2, *by_age.shape[1:])
    return Limits(limits[0], limits[1])


def arriaga(this: LifeTable, that: LifeTable) -> Array:
    """Contribution of each age group to the difference in e0, this minus that, in closed form.

    In a group: the change of years lived in it by those who reached it before, and the years that
    those whom the change saves live afterwards, at the later table's expectation.

    Shape:   tables [..., age] on one grid -> [..., age]; sums to the difference exactly.
    Missing: nan in, nan out.
    Raises:  ValueError where the grids differ.
    Source:  Arriaga (1984), Demography 21; Preston, Heuveline & Guillot (2001), section 3.10.
    """
    if this.grid != that.grid:
        raise ValueError(
            f"the tables' age groups differ ({this.grid.code} and {that.grid.code}); "
            "bring both to one grid and one rule for the open group first"
        )
    n = this.grid.widths[:-1]
    lived = [
        n * (1 - table.qx[..., :-1]) + table.ax[..., :-1] * table.qx[..., :-1]
        for table in (this, that)
    ]
    saved = that.qx[..., :-1] - this.qx[..., :-1]
    closed = that.lx[..., :-1] * (lived[0] - lived[1] + saved * this.ex[..., 1:])
    last = that.lx[..., -1:] * (this.ex[..., -1:] - that.ex[..., -1:])
    return np.concatenate([closed, last], axis=-1)


@dataclass(frozen=True, slots=True)
class _Cuts:
    """Where the line is cut, [cut, ...], in order; 1 where it is not."""

    at: Array
    toward: Array  # sign of the motion through the break of a first-year rule; 0 at other cuts


@dataclass(frozen=True, slots=True)
class _Line:
    """The straight line from one panel to another: rates, person-years and infants' mix."""

    start: Panel
    end: Panel
    from_mx: Array
    to_mx: Array

    @property
    def step(self) -> Array:
        return self.to_mx - self.from_mx

    def at(self, t: Array, settings: Settings, *, infant: float = 1.0) -> Chain:
        """The chains at t [node, ...], the rate of the first age multiplied by `infant`."""
        t = t[..., None]
        mx = self.from_mx + t * self.step
        mx[..., 0] *= infant
        exposure, weight, ratio = (
            getattr(self.start, name) + t * (getattr(self.end, name) - getattr(self.start, name))
            for name in ("exposure", "infant_weight", "infant_ratio")
        )
        panel = replace(
            self.start,
            deaths=mx * exposure,
            exposure=exposure,
            infant_weight=weight,
            infant_ratio=ratio,
        )
        return run(panel, settings, mx=mx)

    def cuts(self, settings: Settings) -> _Cuts:
        grid, found = self.start.grid, []
        rules = [FIRST_YEAR[settings.first_year]] if has_first_year(grid) else []
        rules += [CHILD[settings.child]] if has_child_group(grid) else []
        for sex in (0, 1):
            breaks = {start for rule in rules for start, _, _ in rule[sex] if start > 0}
            for level in sorted(breaks):
                found += self._infant_rate_passes(level, sex)
        still = np.zeros(np.broadcast_shapes(self.step.shape[:-1], *(at.shape for at, _ in found)))
        with np.errstate(all="ignore"):
            bound = (2 / grid.widths[:-1] - self.from_mx[..., :-1]) / self.step[..., :-1]
            last = self.from_mx[..., -1], self.step[..., -1]
            least = np.minimum(last[0], last[0] + last[1])
            found += [((least * 2**k - last[0]) / last[1], still) for k in range(1, DOUBLINGS + 1)]
        found += [(bound[..., x], still) for x in range(len(grid) - 1)]
        at = np.stack([np.broadcast_to(at, still.shape) for at, _ in found])
        toward = np.stack([np.broadcast_to(sign, still.shape) for _, sign in found])
        at = np.where((at > 0) & (at < 1), at, 1.0)
        order = np.argsort(at, axis=0, kind="stable")
        at, toward = (np.take_along_axis(part, order, axis=0) for part in (at, toward))
        some = (at < 1).reshape(len(at), -1).any(axis=1)
        return _Cuts(at[some], toward[some])

    def _infant_rate_passes(self, level: float, sex: int) -> list[tuple[Array, Array]]:
        """Both times at which ratio * m0 of a sex is at a level, and in which direction it passes;
        each of the two moves on a straight line, so their product is a quadratic."""
        m0, dm0 = self.from_mx[..., 0], self.step[..., 0]
        ratio, weight = self.start.infant_ratio[..., sex], self.start.infant_weight[..., sex]
        dratio = self.end.infant_ratio[..., sex] - ratio
        counts = (weight > 0) | (self.end.infant_weight[..., sex] > 0)
        a, b, c = dratio * dm0, ratio * dm0 + m0 * dratio, ratio * m0 - level
        with np.errstate(all="ignore"):
            half = -(b + np.copysign(np.sqrt(b * b - 4 * a * c), b)) / 2
            times = [np.where(counts, root, np.nan) for root in (half / a, c / half)]
            return [(t, np.sign(b + 2 * a * t)) for t in times]

    def jumps(self, indicator: Reading, cuts: _Cuts, settings: Settings) -> Array:
        """What the value jumps by as m0 moves through the break of a first-year rule, [...]."""
        after = np.concatenate([cuts.at[1:], np.ones_like(cuts.at[:1])])
        direction = np.sign(self.step[..., 0])
        # of equal cuts the last one counts
        crossed = (cuts.at < after) & (cuts.toward == direction)
        if not crossed.any():
            return np.zeros(cuts.at.shape[1:])
        above, below = (
            indicator.value(self.at(cuts.at, settings, infant=side))
            for side in (1 + BESIDE, 1 - BESIDE)
        )
        return np.asarray(np.where(crossed, direction * (above - below), 0.0).sum(axis=0))


def _gauss(edges: Array) -> tuple[Array, Array]:
    """Nodes on the line and their weights, [piece * node, ...], of the pieces between edges."""
    low, width = edges[:-1, None], np.diff(edges, axis=0)[:, None]
    spread = (-1, *(1,) * (edges.ndim - 1))
    nodes = low + width * ((1 + NODES) / 2).reshape(spread)
    weights = width * (WEIGHTS / 2).reshape(spread)
    shape = (-1, *edges.shape[1:])
    return nodes.reshape(shape), weights.reshape(shape)
