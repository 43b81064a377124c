"""What moves a smooth number: chance in every count behind it, and the limits that leaves."""

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtri

from engine.ages import AgeGrid, Array
from engine.chain import Chain, Tally, run
from engine.count_limits import Interval, dobson_limits, gamma_limits
from engine.indicator import Indicator, Limits
from engine.panel import Panel
from engine.settings import Settings
from engine.tables import Partials

STACKED = 2**18  # derivatives by one column that are pulled back at once


@dataclass(frozen=True, slots=True)
class Chance:
    """One count more moves the number by its weight; the counts are Poisson.

    Where deaths were shared out among those counted, D = k C, the counts are C and a weight is k
    times that of a death: the variance is that of the original counts.
    """

    weights: Array  # [..., count]
    counts: Array  # [..., count]
    astray: Array  # [...], standard deviation owed to persons counted wrongly

    @property
    def variance(self) -> Array:
        """Of the number by chance in counts, sum w^2 C: [...]."""
        return np.asarray((self.weights**2 * self.counts).sum(axis=-1))

    @property
    def se(self) -> Array:
        """Standard error, [...]; nan where nothing was counted, which tells nothing of chance."""
        variance = self.variance
        return np.asarray(np.sqrt(np.where(variance > 0, variance + self.astray**2, np.nan)))


def told(one: Indicator) -> bool:
    """Whether chance in it is told from slopes or from its count; otherwise it is simulated."""
    return one.smooth or one.unit.limits == "count"


def chances(indicators: Sequence[Indicator], chain: Chain) -> dict[str, Chance]:
    """What moves each indicator, by its key; those that are simulated are left out."""
    found = [one for one in indicators if told(one)]
    astray, step = _astray(found, chain), max(1, STACKED // max(1, chain.table.mx.size))
    behind: dict[str, tuple[Array, Array]] = {}
    for first in range(0, len(found), step):
        behind |= _counts_behind(found[first : first + step], chain)
    return {one.key: Chance(*behind[one.key], astray[one.key]) for one in found}


def _counts_behind(indicators: Sequence[Indicator], chain: Chain) -> dict[str, tuple[Array, Array]]:
    """Weights and counts of each. The pullback walks through the ages in Python, so that many
    numbers are taken through it together; the bits of each are those it has alone."""
    slopes = {one.key: one.partials(chain) for one in indicators}
    by_column = {key: by for key, by in slopes.items() if isinstance(by, Partials)}
    by_rate = {key: by for key, by in slopes.items() if isinstance(by, np.ndarray)}
    found = {
        key: (by.weight[..., None], by.count[..., None])
        for key, by in slopes.items()
        if isinstance(by, Tally)
    }
    pulled = []
    if by_column:
        pulled.append(chain.pull(_side_by_side(by_column.values(), chain.table.mx.shape)))
    if by_rate:
        pulled.append(chain.rates.pull(np.stack(list(by_rate.values()))))
    if pulled:
        weights = per_count(chain.panel, chain.rates.per_death(np.concatenate(pulled)))
        counts = chain.panel.counts
        for key, own in zip((*by_column, *by_rate), weights, strict=True):
            found[key] = (own, counts)
    return found


def per_count(panel: Panel, per_death: Array) -> Array:
    """What one death counted moves, from what one death does: each stands for those that were
    shared out by it, [..., age]."""
    worth = panel.worth
    return per_death if worth is None else per_death * worth


def _astray(indicators: Sequence[Indicator], chain: Chain) -> dict[str, Array]:
    """Standard deviation of each number that is owed to persons counted wrongly."""
    if not indicators:
        return {}

    def values(panel: Panel) -> Array:
        moved = run(panel, chain.settings)
        with np.errstate(all="ignore"):
            return np.stack([one.value(moved) for one in indicators])

    shape = (len(indicators), *chain.panel.batch_shape)
    out = np.broadcast_to(astray(values, chain.panel, settings=chain.settings), shape)
    return {one.key: out[place] for place, one in enumerate(indicators)}


def astray(values: Callable[..., Array], *panels: Panel, settings: Settings) -> Array:
    """Standard deviation of numbers that is owed to persons counted wrongly, in each population for
    itself: half of what they move by from one standard deviation too few to one too many, at all
    ages alike.

    Shape: as `values` of the panels; 0 where the settings name no error of the population.
    """
    error = miscount(panels[0].grid, settings)
    if not error.any():
        return np.zeros(())
    moved: Array = np.zeros(())
    for place, panel in enumerate(panels):
        fewer, more = (
            values(
                *panels[:place],
                replace(panel, exposure=panel.exposure * side),
                *panels[place + 1 :],
            )
            for side in (1 - error, 1 + error)
        )
        with np.errstate(all="ignore"):
            moved = np.hypot(moved, fewer - more)
    return moved / 2


def miscount(grid: AgeGrid, settings: Settings) -> Array:
    """Relative error of the person-years of each group, one standard deviation, [age]; a group has
    that of the age it begins at.

    >>> some = Settings("", "", "one_over_m", population_error=((65, 2.0),))
    >>> miscount(AgeGrid((0, 65, 85)), some)
    array([0.  , 0.02, 0.02])
    """
    error = np.zeros(len(grid))
    for age, percent in sorted(settings.population_error):
        error[np.array(grid.starts) >= age] = percent / 100
    return error


def _side_by_side(parts: Iterable[Partials], shape: tuple[int, ...]) -> Partials:
    """Derivatives of several numbers, on a new first axis."""
    columns = ([getattr(part, name) for part in parts] for name in Partials.__slots__)
    return Partials(
        *(
            None
            if all(by is None for by in column)
            else np.stack([np.broadcast_to(0.0 if by is None else by, shape) for by in column])
            for column in columns
        )
    )


@dataclass(frozen=True, slots=True)
class Kind:
    """How limits of a kind of number are taken."""

    more: float  # deaths there might have been, where one weighs most, though none was counted
    least: float  # no limit lies below
    most: float  # or above


KINDS: dict[Limits, Kind] = {
    "mixed": Kind(0.5, -np.inf, np.inf),
    "part": Kind(1.0, 0.0, 1.0),
    "gamma": Kind(1.0, 0.0, np.inf),
    "count": Kind(1.0, 0.0, np.inf),
}


# person-years below which limits hold the truth more often than their level says
CAUTIOUS_BELOW: dict[Limits, float] = {
    "mixed": 100_000,
    "part": 100_000,
    "gamma": 100_000,
    "count": 1_000_000,
}


def cautious(indicator: Indicator, person_years: Array) -> NDArray[np.bool_]:
    """Whether an interval is wider than its level asks for, since few deaths may weigh much.

    At 95 %, with Poisson deaths, it then holds the truth in up to 99 of 100 populations; beyond in
    94 to 97. Simulated ones stand apart. Measured: tests/studies/coverage.md.
    """
    few = np.asarray(person_years) < CAUTIOUS_BELOW[indicator.unit.limits]
    return np.asarray(few & told(indicator))


def limits(
    kind: Limits,
    value: Array,
    chance: Chance,
    level: float,
    *,
    apart: bool = False,
    rates: str = "gamma",
) -> Interval:
    """Limits of a number from the gamma laws of the deaths behind it.

    To first order a number is a constant, and a weighted sum of the deaths that raise it, less one
    of those that lower it. Each sum has its own gamma limits, skew where few deaths weigh much: by
    Pythagoras of how far the first reaches down and the second up, so far does the number reach
    down; likewise up. A sum of counts keeps the limits of Fay and Feuer, one count the exact ones.

    For rates, counts and parts of a whole the upper ends allow for one death more where it weighs
    most, so that the truth is never missed too often; for other numbers for half of one, as mid-p
    limits do, which comes nearest to the level (tests/studies/coverage.md). Persons counted wrongly
    widen both sides, as one more part that is independent of the deaths. Of two numbers `apart`,
    the value is their difference, which may have any sign. `rates` as in settings: "dobson" gives
    rates, sums of deaths of positive weight, the limits of `dobson_limits`.

    Shape:   value [...], chance [..., count] -> [...] each.
    Source:  Fay & Feuer (1997), Statistics in Medicine 16, 791-801 (gamma limits); Fay & Kim
             (2017), Biometrical Journal 59, 377-387 (mid-p gamma limits); Zou & Donner (2008),
             Statistics in Medicine 27, 1693-1702 (limits of a difference from those of its parts).
    """
    own = KINDS[kind]
    with np.errstate(all="ignore"):
        if kind == "gamma" and rates == "dobson" and not apart:
            total = (chance.weights * chance.counts).sum(axis=-1)
            low, high = dobson_limits(chance.weights, chance.counts, level)
            none = np.zeros_like(total)
            raised, lowered = Interval(total - low, high - total), Interval(none, none)
        else:
            raised, lowered = (
                _reach(np.maximum(sign * chance.weights, 0.0), chance.counts, level, own.more)
                for sign in (1, -1)
            )
        astray = float(ndtri((1 + level) / 2)) * chance.astray
        low = value - np.sqrt(_squares(raised.low, lowered.high, astray))
        high = value + np.sqrt(_squares(raised.high, lowered.low, astray))
    if apart:
        return Interval(low, high)
    return Interval(np.clip(low, own.least, own.most), np.clip(high, own.least, own.most))


def _reach(weights: Array, counts: Array, level: float, more: float) -> Interval:
    """How far the limits of sum w D, w at least 0, lie below and above it."""
    total, largest = (weights * counts).sum(axis=-1), weights.max(axis=-1)
    variance = (weights**2 * counts).sum(axis=-1)
    low, high = gamma_limits(total, variance, largest, level, more=more)
    nothing = largest == 0
    return Interval(*(np.where(nothing, 0.0, far) for far in (total - low, high - total)))


def _squares(*parts: Array) -> Array:
    """The sum of squares; a power of a single number is rounded otherwise than one of many."""
    return np.asarray(sum(np.square(part) for part in parts))
