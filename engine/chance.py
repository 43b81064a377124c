"""What moves a smooth number: chance in every count behind it; and limits on the scale it has."""

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from scipy.special import expit, logit, ndtri

from engine.ages import Array
from engine.chain import Chain, Tally
from engine.count_limits import Interval, gamma_limits
from engine.indicator import Indicator, Limits
from engine.tables import Partials

STACKED = 2**18  # derivatives by one column that are pulled back at once


@dataclass(frozen=True, slots=True)
class Chance:
    """One count more moves the number by its weight; the counts are Poisson."""

    weights: Array  # [..., count]
    counts: Array  # [..., count]

    @property
    def variance(self) -> Array:
        """Of the number, sum w^2 D: [...]."""
        return np.asarray((self.weights**2 * self.counts).sum(axis=-1))

    @property
    def se(self) -> Array:
        """Standard error, [...]; nan where nothing was counted, which tells nothing of chance."""
        variance = self.variance
        return np.asarray(np.sqrt(np.where(variance > 0, variance, np.nan)))


def chances(indicators: Sequence[Indicator], chain: Chain) -> dict[str, Chance]:
    """What moves each indicator that is smooth, by its key.

    The pullback walks through the ages in Python, so that many indicators are taken through it
    together; the bits of each are those it has alone.
    """
    found: dict[str, Chance] = {}
    smooth = [one for one in indicators if one.smooth]
    step = max(1, STACKED // max(1, chain.table.mx.size))
    for first in range(0, len(smooth), step):
        slopes = {one.key: one.partials(chain) for one in smooth[first : first + step]}
        by_column = {key: by for key, by in slopes.items() if isinstance(by, Partials)}
        by_rate = {key: by for key, by in slopes.items() if isinstance(by, np.ndarray)}
        tallies = {key: by for key, by in slopes.items() if isinstance(by, Tally)}
        if by_column:
            pulled = chain.pull(_side_by_side(by_column.values(), chain.table.mx.shape))
            found |= _by_death(by_column, pulled, chain)
        if by_rate:
            pulled = chain.rates.pull(np.stack(list(by_rate.values())))
            found |= _by_death(by_rate, pulled, chain)
        for key, by in tallies.items():
            found[key] = Chance(by.weight[..., None], by.count[..., None])
    return found


def _by_death(keys: Iterable[str], pulled: Array, chain: Chain) -> dict[str, Chance]:
    weights = chain.rates.per_death(pulled)
    return {key: Chance(own, chain.panel.deaths) for key, own in zip(keys, weights, strict=True)}


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


def limits(kind: Limits, value: Array, chance: Chance, level: float) -> Interval:
    """Limits of a number on the scale that its kind names (see engine.indicator.Unit).

    Missing: nan where nothing was counted, but for sums of counts, whose upper limit then tells
             how many there might have been.
    Source:  as in `engine.uncertainty.estimates`.
    """
    with np.errstate(all="ignore"):
        return LIMITS[kind](value, chance, level)


def _evenly(value: Array, chance: Chance, level: float) -> Interval:
    half = _quantile(level) * chance.se
    return Interval(value - half, value + half)


def _by_odds(value: Array, chance: Chance, level: float) -> Interval:
    """As far apart to first order on the scale of log odds: none passes 0 or 1."""
    centre, reach = logit(value), _quantile(level) * chance.se / (value * (1 - value))
    return Interval(expit(centre - reach), expit(centre + reach))


def _by_counts(value: Array, chance: Chance, level: float) -> Interval:
    return gamma_limits(value, chance.variance, chance.weights.max(axis=-1), level)


def _quantile(level: float) -> float:
    return float(ndtri((1 + level) / 2))


LIMITS: dict[Limits, Callable[[Array, Chance, float], Interval]] = {
    "even": _evenly,
    "odds": _by_odds,
    "gamma": _by_counts,
    "count": _by_counts,
}
