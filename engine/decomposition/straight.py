"""The straight line from one population to another, and where it must be cut to be integrated."""

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from engine.ages import Array
from engine.chain import Chain, Reading, gradient, run
from engine.panel import BESIDE, COUNTED, Panel
from engine.settings import Settings
from engine.stages.inside import bounds
from engine.stages.separation import CHILD, FIRST_YEAR, has_child_group, has_first_year
from engine.tables import Partials

NODES, WEIGHTS = np.polynomial.legendre.leggauss(8)
BESIDE_JUMP = 1e-13  # relative distance at which the two sides of a jump are read
DOUBLINGS = 8  # cuts as a rate doubles: 1 / m of the open group bends too sharply for eight nodes


def require_one_grid(this: Panel, that: Panel) -> None:
    if this.grid != that.grid:
        raise ValueError(
            f"the age groups differ ({this.grid.code} and {that.grid.code}); "
            "regroup both to their common grid first"
        )


@dataclass(frozen=True, slots=True)
class _Cuts:
    """Where the line is cut, [cut, ...], in order; 1 where it is not."""

    at: Array
    toward: Array  # sign of the motion through the break of a first-year rule; 0 at other cuts


@dataclass(frozen=True, slots=True)
class Line:
    """From one panel to another: rates and all that stands beside them move evenly in t."""

    start: Chain
    end: Chain
    from_mx: Array  # [..., age], of the batch of both
    to_mx: Array

    @classmethod
    def between(cls, start: Panel, end: Panel, settings: Settings, indicator: Reading) -> "Line":
        """In the rates that the number rests on: those as counted or, of a number read off the
        table, with that of the open group as borrowed where it is.

        Raises: ValueError where the grids differ.
        """
        require_one_grid(start, end)
        ends = run(start, settings), run(end, settings)
        of_table = indicator.smooth and isinstance(indicator.partials(ends[0]), Partials)
        from_mx, to_mx = np.broadcast_arrays(
            *(chain.mx if of_table else chain.rates.mx for chain in ends)
        )
        return cls(*ends, from_mx, to_mx)

    @property
    def step(self) -> Array:
        return self.to_mx - self.from_mx

    def difference(self, indicator: Reading) -> Array:
        """The number at the end less that at the start, [...]."""
        with np.errstate(all="ignore"):
            return np.asarray(indicator.value(self.end) - indicator.value(self.start))

    def at(self, t: Array, *, times: Array | float = 1.0) -> Chain:
        """The chains at t [node, ...], the rates multiplied by `times`."""
        t = t[..., None]
        mx = (self.from_mx + t * self.step) * times
        panel = _mixed(self.start.panel, self.end.panel, t)
        return run(replace(panel, deaths=mx * panel.exposure), self.start.settings, mx=mx)

    def mean_slope(self, indicator: Reading) -> Array:
        """The gradient in the raw rates, averaged over the line; a jump of a first-year rule is
        shared out over the way that m0 goes. [..., age]"""
        cuts = self._cuts()
        one = np.ones((1, *cuts.at.shape[1:]))
        nodes, weights = _gauss(np.concatenate([0 * one, cuts.at, one]))
        slopes = gradient(indicator, self.at(nodes))
        with np.errstate(all="ignore"):
            parts = np.where(weights[..., None] > 0, weights[..., None] * slopes, 0.0)
            mean: Array = parts.sum(axis=0)
            jumps, way = self._jumps(indicator, cuts), self.step[..., 0]
            mean[..., 0] += np.where(jumps == 0, 0.0, jumps / way)
        return mean

    def _cuts(self) -> _Cuts:
        settings, grid, found = self.start.settings, self.start.panel.grid, []
        rules = [FIRST_YEAR[settings.first_year]] if has_first_year(grid) else []
        rules += [CHILD[settings.child]] if has_child_group(grid) else []
        for sex in (0, 1):
            breaks = {start for rule in rules for start, _, _ in rule[sex] if start > 0}
            for level in sorted(breaks):
                found += self._infant_rate_passes(level, sex)
        still = np.zeros(np.broadcast_shapes(self.step.shape[:-1], *(at.shape for at, _ in found)))
        with np.errstate(all="ignore"):
            bound = bounds(grid, settings.inside) - self.from_mx[..., :-1]
            found += [(t, still) for t in np.moveaxis(bound / self.step[..., :-1], -1, 0)]
            found += [(t, still) for t in self._open_rate_doubles()]
            if settings.inside == "keyfitz":
                found += [(t, still) for t in self._neighbours_bend()]
        at = np.stack([np.broadcast_to(at, still.shape) for at, _ in found])
        toward = np.stack([np.broadcast_to(sign, still.shape) for _, sign in found])
        at = np.where((at > 0) & (at < 1), at, 1.0)
        order = np.argsort(at, axis=0, kind="stable")
        at, toward = (np.take_along_axis(part, order, axis=0) for part in (at, toward))
        some = (at < 1).reshape(len(at), -1).any(axis=1)
        return _Cuts(at[some], toward[some])

    def _open_rate_doubles(self) -> list[Array]:
        """Where the open group's rate is twice, four times ... its least on the line."""
        first, step = self.from_mx[..., -1], self.step[..., -1]
        least = np.minimum(first, first + step)
        return [(least * 2**k - first) / step for k in range(1, DOUBLINGS + 1)]

    def _neighbours_bend(self) -> list[Array]:
        """Where ax, read off the neighbours' deaths over the group's own, bends sharply: near 1 / m
        and ever closer to an end at which a rate is 0 that is not 0 at the other."""
        full = 2 / self.start.panel.grid.widths[:-1]
        found = list(np.moveaxis((full - self.from_mx[..., :-1]) / self.step[..., :-1], -1, 0))
        fills = ((self.from_mx == 0) & (self.to_mx > 0)).any(axis=-1)
        empties = ((self.to_mx == 0) & (self.from_mx > 0)).any(axis=-1)
        for t in (0.5**k for k in range(1, DOUBLINGS + 1)):
            found += [np.where(fills, t, 1.0), np.where(empties, 1 - t, 1.0)]
        return found

    def _infant_rate_passes(self, level: float, sex: int) -> list[tuple[Array, Array]]:
        """Both times at which ratio * m0 of a sex is at a level, and in which direction it passes;
        each of the two moves on a straight line, so their product is a quadratic."""
        m0, dm0 = self.from_mx[..., 0], self.step[..., 0]
        start, end = self.start.panel, self.end.panel
        ratio = start.infant_ratio[..., sex]
        dratio = end.infant_ratio[..., sex] - ratio
        counts = (start.infant_weight[..., sex] > 0) | (end.infant_weight[..., sex] > 0)
        a, b, c = dratio * dm0, ratio * dm0 + m0 * dratio, ratio * m0 - level
        with np.errstate(all="ignore"):
            half = -(b + np.copysign(np.sqrt(b * b - 4 * a * c), b)) / 2
            times = [np.where(counts, root, np.nan) for root in (half / a, c / half)]
            return [(t, np.sign(b + 2 * a * t)) for t in times]

    def _jumps(self, indicator: Reading, cuts: _Cuts) -> Array:
        """What the value jumps by as m0 moves through the break of a first-year rule, [...]."""
        after = np.concatenate([cuts.at[1:], np.ones_like(cuts.at[:1])])
        direction = np.sign(self.step[..., 0])
        # of equal cuts the last one counts
        crossed = (cuts.at < after) & (cuts.toward == direction)
        if not crossed.any():
            return np.zeros(cuts.at.shape[1:])
        infant = np.zeros(self.step.shape[-1])
        infant[0] = BESIDE_JUMP
        above, below = (
            indicator.value(self.at(cuts.at, times=1 + side * infant)) for side in (1, -1)
        )
        return np.asarray(np.where(crossed, direction * (above - below), 0.0).sum(axis=0))


def _mixed(start: Panel, end: Panel, t: Array) -> Panel:
    """Part t [..., 1] of the way in everything that is counted; what stands beside one of the two
    only is left out."""
    moved: dict[str, Any] = {
        name: getattr(start, name) + t * (getattr(end, name) - getattr(start, name))
        for name in COUNTED
    }
    for name in BESIDE:
        first, last = getattr(start, name), getattr(end, name)
        moved[name] = None if first is None or last is None else _mixed(first, last, t)
    return replace(start, **moved)


def _gauss(edges: Array) -> tuple[Array, Array]:
    """Nodes on the line and their weights, [piece * node, ...], of the pieces between edges."""
    low, width = edges[:-1, None], np.diff(edges, axis=0)[:, None]
    spread = (-1, *(1,) * (edges.ndim - 1))
    nodes = low + width * ((1 + NODES) / 2).reshape(spread)
    weights = width * (WEIGHTS / 2).reshape(spread)
    shape = (-1, *edges.shape[1:])
    return nodes.reshape(shape), weights.reshape(shape)
