"""Which change, the same at all chosen ages and causes, brings a number to a target."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from engine.blocks import blocks
from engine.chain import Chain, Tally, run
from engine.chance import Chance, chances, limits
from engine.indicator import Indicator
from engine.panel import Panel
from engine.roots import false_position
from engine.settings import Settings
from engine.whatif import Change, Parts, changed

LEAST_SHARE = 1e-6  # of the deaths, where the number has no value without any
# factors looked at first: every 2 % down to no deaths, every 5 % up to twice as many
LOOKED_AT = np.concatenate([np.linspace(0.0, 1.0, 51), np.linspace(1.05, 2.0, 20)])
CLOSE = 1e-12  # of the number itself


@dataclass(frozen=True, slots=True)
class Reach:
    """The factor on the chosen rates that reaches the target, and what can be reached at all."""

    factor: Array  # [...], nan where out of reach
    low: Array  # limits of the factor
    high: Array
    now: Array  # the number at the rates there are
    without: Array  # and if none of those deaths happened; nan where it has no value then


def uniform(
    indicator: Indicator,
    panel: Panel,
    parts: Parts,
    cells: NDArray[np.bool_],
    target: Array,
    settings: Settings,
    *,
    from_now: bool = False,
) -> Reach:
    """The factor nearest to 1 at which the number is the target, all chosen rates times it;
    `from_now`: at which it differs by so much from what it is at the rates there are.

    By running the whole chain anew, at factors from 0 to 2 and then between the two neighbours that
    hold the target between them. Its limits: one death more moves the number at that factor, which
    must move to make up for it; counted from now, less what it moves the number now.

    Shape:   panel [..., age], cells [..., part, age], target [...] -> [...]; batches broadcast.
    Missing: the factor is nan where no such factor reaches the target.
    Raises:  ValueError where the indicator has no derivative, or is a count over births.
    """
    if not indicator.smooth:
        raise ValueError(f"{indicator.label} jumps: no change brings it to a stated target exactly")
    if isinstance(indicator.partials(run(panel, settings)), Tally):
        raise ValueError(f"{indicator.label} is a count over births, not read off death rates")
    aimed = _Aimed(indicator, panel, parts, cells, settings)
    batch = np.broadcast_shapes(panel.batch_shape, cells.shape[:-2], np.shape(target))
    seen = aimed.looked_at(batch)
    one = int(np.flatnonzero(LOOKED_AT == 1.0)[0])
    target = target + seen[one] if from_now else target
    left = seen - target
    low, high = _nearest(left)
    ends = [np.take_along_axis(left, at[None], axis=0)[0] for at in (low, high)]
    found = false_position(
        lambda factor: aimed.value(factor) - target,
        _at(low),
        _at(high),
        at_low=np.where(low == high, np.nan, ends[0]),
        at_high=np.where(low == high, np.nan, ends[1]),
        close=np.maximum(np.abs(CLOSE * target), 1e-300),
    )
    limit = aimed.limits(found, from_now=from_now)
    return Reach(found, *limit, seen[one], seen[0])


def _at(place: NDArray[np.intp]) -> Array:
    """Factors at these places, the first of which stands for no deaths or next to none."""
    return np.where(place == 0, LEAST_SHARE, LOOKED_AT[place])


def _nearest(left: Array) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """The two neighbours [...], among [factor, ...], that hold 0 between them and lie nearest to
    1; the same place twice where none do."""
    with np.errstate(invalid="ignore"):
        turns = left[:-1] * left[1:] <= 0
    far = np.abs((LOOKED_AT[:-1] + LOOKED_AT[1:]) / 2 - 1).reshape(-1, *(1,) * (left.ndim - 1))
    far = np.where(turns, far, np.inf)
    low = np.argmin(far, axis=0)
    found = np.isfinite(np.take_along_axis(far, low[None], axis=0)[0])
    return low, np.where(found, low + 1, low)


@dataclass(frozen=True, slots=True)
class _Aimed:
    """Populations at which the chosen rates are multiplied by one factor."""

    indicator: Indicator
    panel: Panel
    parts: Parts
    cells: NDArray[np.bool_]
    settings: Settings

    def chain(self, factor: Array) -> Chain:
        times = 1 - (1 - factor[..., None, None]) * self.cells
        return run(changed(self.panel, self.parts, Change(times)), self.settings)

    def value(self, factor: Array) -> Array:
        with np.errstate(all="ignore"):
            chain = self.chain(factor)
            lent = chain.borrowed & ~run(self.panel, self.settings).borrowed
            return np.asarray(np.where(lent, np.nan, self.indicator.value(chain)))

    def looked_at(self, batch: tuple[int, ...]) -> Array:
        """The number at each of the factors, [factor, ...]; without deaths as near to none as
        it has a value."""
        seen = np.empty((len(LOOKED_AT), *batch))
        for some in blocks(len(LOOKED_AT), int(np.prod(batch))):
            factors = LOOKED_AT[some].reshape(-1, *(1,) * len(batch))
            seen[some] = self.value(np.broadcast_to(factors, (factors.shape[0], *batch)))
        next_to_none = self.value(np.full(batch, LEAST_SHARE))
        seen[0] = np.where(np.isfinite(seen[0]), seen[0], next_to_none)
        return seen

    def weights(self, factor: Array) -> Array:
        """What one death more of each age moves the number by at a factor, [..., 1, age]."""
        found = chances([self.indicator], self.chain(factor))[self.indicator.key].weights
        return found[..., None, :]

    def limits(self, factor: Array, *, from_now: bool) -> tuple[Array, Array]:
        """Where chance in the deaths leaves the factor."""
        with np.errstate(all="ignore"):
            weights = self.weights(factor)
            times = 1 - (1 - factor[..., None, None]) * self.cells
            own = self.weights(np.ones_like(factor)) if from_now else 0.0
            by_death = (weights * times - own) * self.parts.worth
            slope = (weights * self.cells * self.parts.deaths).sum(axis=(-2, -1))
            moved = -by_death / slope[..., None, None]
            wide = moved.shape[:-2]
            counts = np.broadcast_to(self.parts.counts, moved.shape).reshape(*wide, -1)
            chance = Chance(moved.reshape(*wide, -1), counts, np.zeros(wide))
            low, high = limits("mixed", factor, chance, self.settings.level, apart=True)
        known = np.isfinite(factor)
        return np.where(known, np.maximum(low, 0.0), np.nan), np.where(known, high, np.nan)
