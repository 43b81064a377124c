"""Where lower death rates would add most, and how many deaths fewer a stated gain would take."""

from dataclasses import dataclass, replace

import numpy as np

from engine.ages import Array
from engine.blocks import blocks
from engine.chain import Chain, Reading, Tally, run
from engine.roots import false_position
from engine.tables import Partials, pull

ONE_PERCENT = 0.01
ONE_MONTH = 1 / 12  # of a year
LEAST_SHARE = 1e-6  # of the deaths at an age, where the number has no value without any
CLOSE = 1e-11  # of the stated gain, and
ROUNDING = 1e-14  # of the number itself


def by_survival(indicator: Reading, chain: Chain) -> Array:
    """d indicator / d px, ax held, in its unit per unit of probability; for e0 it is
    (1 / px) T(x+n) + (n - ax) lx.

    Never summed over ages: px + 0.01 is another effort at each age, out of reach where px is near 1
    and longer or shorter with the width of the group, so that a sum is in no unit. Elasticities
    are in one, and add up.

    Shape:   chain [...] -> [..., age - 1] on the grid of its table; the open group has no px.
    Missing: nan where the indicator or its gradient is.
    Raises:  ValueError where the indicator has no derivative, or is not read off the table.
    Source:  Keyfitz (1977), Applied Mathematical Demography, chapter 3; Vaupel (1986), Population
             Studies 40 (effect of a change of mortality at one age on life expectancy).
    """
    table = chain.table
    slopes = pull(table, _of_table(indicator, chain)).mx[..., :-1]
    n = table.grid.widths[:-1]
    with np.errstate(all="ignore"):
        per_rate = n / (1 + (n - table.ax[..., :-1]) * table.mx[..., :-1]) ** 2
        return np.asarray(-slopes / per_rate)


def elasticity(indicator: Reading, chain: Chain) -> Array:
    """d log indicator / d log mx, ax held: by what part of itself the number moves for a rate that
    is higher by the same part. In the open group ax is 1 / mx, and moves.

    Those of e0 sum to -H: all rates 1 % higher make life H % shorter. Those of a standardised rate
    sum to 1.

    Shape:   chain [...] -> [..., age] on the grid of its table, or, of a number read off the rates
             as counted, on the grid of its panel.
    Missing: nan where the indicator or its gradient is.
    Raises:  ValueError where the indicator has no derivative.
    Source:  Leser (1955), Population Studies 9, 67-71; Keyfitz (1977), Applied Mathematical
             Demography, chapter 3.
    """
    _require_smooth(indicator)
    partials = indicator.partials(chain)
    if isinstance(partials, Tally):
        raise ValueError(f"{indicator.label} is a count over births, not read off death rates")
    with np.errstate(all="ignore"):
        value = indicator.value(chain)[..., None]
        if not isinstance(partials, Partials):
            return np.asarray(chain.rates.mx * partials / value)
        slopes = pull(chain.table, partials)
        by_rate = slopes.mx
        by_rate[..., -1] += slopes.ax[..., -1] * chain.separation.own[..., -1]
        return np.asarray(chain.table.mx * by_rate / value)


def gain_per_percent(indicator: Reading, chain: Chain) -> Array:
    """What the indicator gains if the death rate at one age of the table were 1 % lower, in its
    unit.

    First order: -0.01 mx d indicator / d mx, ax following its rule. The rate is lowered at that age
    alone: groups joined for want of person-years, and the ages of a fitted law, each for itself.
    Divide by the group's width for a figure per year of age.

    Shape:   chain [...] -> [..., age] on the grid of its table.
    Missing: nan where the indicator or its gradient is.
    Raises:  ValueError where the indicator has no derivative, or is not read off the table.
    """
    slopes = pull(chain.table, _of_table(indicator, chain))
    with np.errstate(all="ignore"):
        by_rate = slopes.mx + chain.separation.pull(slopes.ax)
        return np.asarray(-ONE_PERCENT * chain.table.mx * by_rate)


@dataclass(frozen=True, slots=True)
class Avoidable:
    """Deaths fewer at each age alone that would bring a stated gain, each [..., age]."""

    deaths: Array  # nan where not even all deaths of that age would do
    there: Array  # the deaths that there are
    most: Array  # the gain if none of them had happened, in the indicator's unit


def deaths_to_avoid(indicator: Reading, chain: Chain, gain: float = ONE_MONTH) -> Avoidable:
    """How many deaths fewer at one age, all other ages as they are, move the indicator by `gain`.

    Not by the gradient, which at an age of few deaths would ask for more than there are: the whole
    chain is run with fewer deaths at that age, person-years held, until the gain is met. A gain may
    be negative, as for a number that is better lower. What stands beside the counts is held.

    Shape:   chain [...] -> [..., age] on the grid of its panel.
    Missing: deaths are nan where `most` falls short of the gain; `most` is nan where the number has
             no value without deaths at that age (life expectancy in the open group has no bound).
    Raises:  ValueError where the indicator has no derivative, or the gain is 0.
    """
    _require_smooth(indicator)
    if gain == 0:
        raise ValueError("a gain of 0 takes no deaths; name one above or below it")
    there, ages = chain.rates.deaths, len(chain.panel.grid)
    deaths, most = np.full((2, ages, *there.shape[:-1]), np.nan)
    with np.errstate(all="ignore"):
        for some in blocks(ages, there.size // ages):
            lowered = _Lowered(indicator, chain, gain, np.eye(ages)[some])
            most[some] = lowered.part(np.zeros_like(deaths[some])) * gain
            deaths[some] = 1 - lowered.share_left(most[some] / gain)
    return Avoidable(np.moveaxis(deaths, 0, -1) * there, there, np.moveaxis(most, 0, -1))


@dataclass(frozen=True, slots=True)
class _Lowered:
    """Populations in which only a share of the deaths at one age happened."""

    indicator: Reading
    chain: Chain
    gain: float
    ages: Array  # [moved, age], 1 at the age moved

    def part(self, share: Array) -> Array:
        """The part of the stated gain that comes of it, [moved, ...]."""
        panel, batch = self.chain.panel, self.chain.rates.deaths.ndim - 1
        at = self.ages.reshape(-1, *(1,) * batch, self.ages.shape[-1])
        fewer = replace(
            panel.over(lambda array: array[None]),
            deaths=panel.deaths * (1 - (1 - share[..., None]) * at),
        )
        chain = run(fewer, self.chain.settings)
        moved = self.indicator.value(chain) - self.indicator.value(self.chain)
        # a rate borrowed for want of deaths is another population's: no deaths avoided bring it
        lent = chain.borrowed & ~self.chain.borrowed
        return np.asarray(np.where(lent, np.nan, moved) / self.gain)

    def share_left(self, at_none: Array) -> Array:
        """The share of deaths that leaves exactly the gain, by false position (Illinois); nan where
        no share does."""
        low = np.where(np.isnan(at_none), LEAST_SHARE, 0.0)
        above = np.where(np.isnan(at_none), self.part(low), at_none) - 1
        with np.errstate(all="ignore"):
            close = CLOSE + np.abs(ROUNDING * self.indicator.value(self.chain) / self.gain)
        return false_position(
            lambda share: self.part(share) - 1,
            low,
            np.ones_like(low),
            at_low=np.where(above >= 0, above, np.nan),
            at_high=np.full_like(low, -1.0),
            close=close,
        )


def _of_table(indicator: Reading, chain: Chain) -> Partials:
    _require_smooth(indicator)
    partials = indicator.partials(chain)
    if not isinstance(partials, Partials):
        raise ValueError(f"{indicator.label} is read off the rates as counted, not off the table")
    return partials


def _require_smooth(indicator: Reading) -> None:
    if not indicator.smooth:
        raise ValueError(
            f"{indicator.label} has no derivative by death rates: {indicator.why_not_smooth}"
        )
