"""The population at the open age that the deaths there imply, and what figures it would give."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtri

from engine.ageing import within
from engine.ages import AgeGrid, Array
from engine.chain import run
from engine.chance import per_count
from engine.estimates import Estimate, Reason
from engine.indicator import Indicator
from engine.laws import GOMPERTZ, Fit, fit
from engine.panel import Panel
from engine.reasons import judge
from engine.settings import Settings
from engine.survival import lives

SPAN = (50, 84)  # completed years over which the rise with age is read
YOUNGEST, USUAL = 85, 90  # the ages that are judged begin at the oldest start between the two
LEAST_OPEN = 100  # deaths there: their chance alone is then 10 % of the ratio
LEAST_BELOW = 1000  # deaths in the span: carried 20 years on, the chance of the slope is then 7 %


@dataclass(frozen=True, slots=True)
class ImpliedPopulation:
    """People of `age` and over that the deaths imply, as a ratio to those handed in: 1.2 says that
    the deaths are those of a population a fifth larger."""

    age: int
    ratio: Estimate
    observed: Array  # [...], death rate at `age` and over, over the one expected from the span
    observed_whole: Array  # the same of the whole


def implied_population(
    panel: Panel,
    whole: Panel,
    settings: Settings,
    *,
    age: int | None = None,
    shared: Panel | None = None,
) -> ImpliedPopulation:
    """Population at the open age implied by its deaths, over the one handed in, with its interval.

    A Gompertz law fitted to the groups from 50 to 84 expects the rate 1 / e(age) at `age` and over
    (90, or where no group begins there the oldest start from 85, unless another is given). The rate
    observed there is set against that. The same is done for the whole, whose ratio takes out what
    holds everywhere: that death rates rise more slowly at the highest ages, and how the very old
    are spread. Ratio over ratio tells how much too high the area's rate is, and so how many more
    people its deaths imply: (D / E e)(area) / (D / E e)(whole). What sets the area apart otherwise
    is taken for one of population: 1 % less where its rates are a fifth higher and level off at the
    highest ages, 4 % where its slope is 0.105 against 0.100, 3 % where only its very old become
    more by 3 % a year. So a few per cent tell nothing.

    The interval is even on the scale of logarithms: deaths are Poisson, in the open ages and behind
    both laws; all deaths of the area are in the whole too, or those of `shared` if given. The whole
    holds the area: where that is a large part of it, the ratio is drawn towards 1; hand in the rest
    of the whole, with nobody shared, to avoid it.

    Shape:   panels of one batch on one grid -> [...].
    Missing: nan with its reason: counts not at hand; ages that begin below 85; fewer than 100
             deaths there or 1,000 in the span in either (with as many the limits are a quarter
             away); no law that rises with age.
    Raises:  ValueError where the grids differ, or no group begins at the age given.
    Source:  Preston, Elo & Stewart (1999), Population Studies 53, 165-177 (counts of the very old
             and what their errors do); Missov & Lenart (2013), Theoretical Population Biology 90,
             29-35 (expectancy under the law). The ratio of the two ratios is Ebbline's own.
    """
    if panel.grid != whole.grid:
        raise ValueError(
            f"the age groups differ, {panel.grid.code} and {whole.grid.code}; regroup both to "
            "those they have in common"
        )
    age = judged_age(panel.grid) if age is None else age
    panel.grid.position(age)
    with np.errstate(all="ignore"):
        own, parent = _Side.of(panel, age), _Side.of(whole, age)
        log = np.log(own.ratio) - np.log(parent.ratio)
        both = panel.counts if shared is None else shared.counts
        by_own, by_parent = per_count(panel, own.weights), per_count(whole, parent.weights)
        variance = by_own**2 * panel.counts + by_parent**2 * whole.counts
        variance = variance - 2 * by_own * by_parent * both
        se = np.sqrt(np.maximum(variance.sum(axis=-1), 0.0))
        half = float(ndtri((1 + settings.level) / 2)) * np.where(se > 0, se, np.nan)
        value = np.exp(log)
    bare = Estimate.bare(value, _reasons(panel, whole, age, value), Reason.NO_SAMPLING_INTERVAL)
    limits = np.exp(log - half), np.exp(log + half)
    ratio = bare.within(*limits, value * se, Reason.NO_SAMPLING_INTERVAL)
    told = np.where(np.isnan(ratio.value), np.nan, 1.0)
    return ImpliedPopulation(age, ratio, told * own.ratio, told * parent.ratio)


def as_implied(
    indicators: Sequence[Indicator], panel: Panel, implied: ImpliedPopulation, settings: Settings
) -> dict[str, Estimate]:
    """What each indicator would be with the population that the deaths imply, by its key.

    The person-years of every group from the judged age on are multiplied by the ratio; low and high
    are what the figure is as the ratio goes over its interval, and no chance besides. A number read
    off closed groups alone, as a mode, moves only where some of those ages are in closed groups.

    Shape:   as the panel's -> [...].
    Missing: where there is no ratio, with its reason; else as for the indicator. No standard error.
    """
    ratio = implied.ratio
    several = np.stack([ratio.value, ratio.low, ratio.high])
    old = np.array(panel.grid.starts) >= implied.age
    grown = panel.over(lambda counts: np.broadcast_to(counts, (3, *counts.shape)))
    factor = np.where(old, several[..., None], 1.0)
    chain = run(replace(grown, exposure=grown.exposure * factor), settings)

    def told(one: Indicator) -> Estimate:
        with np.errstate(all="ignore"):
            values = np.broadcast_to(one.value(chain), several.shape)
        own = judge(one.needs, chain, values)[0]
        reason = np.where(np.isnan(ratio.value), ratio.reason, own).astype(np.uint8)
        low, high = np.sort(values[1:], axis=0)
        bare = Estimate.bare(values[0], reason, Reason.NO_SAMPLING_INTERVAL)
        return bare.within(low, high, np.full(low.shape, np.nan), Reason.NO_SAMPLING_INTERVAL)

    return {one.key: told(one) for one in indicators}


def judged_age(grid: AgeGrid) -> int:
    """The oldest start from 85 to 90, or the open age where there is none.

    >>> judged_age(AgeGrid((0, 60, 85, 90, 95, 100)))
    90
    """
    starts = [start for start in grid.starts if YOUNGEST <= start <= USUAL]
    return max(starts, default=grid.open_age)


@dataclass(frozen=True, slots=True)
class _Side:
    """Observed over expected rate of one population, and what one death more moves its logarithm
    by."""

    ratio: Array  # [...]
    weights: Array  # [..., age]

    @classmethod
    def of(cls, panel: Panel, age: int) -> "_Side":
        old = np.array(panel.grid.starts) >= age
        law = _rising(panel)
        ahead = lives(law.law, law.parameters, law.centre, age=float(age))
        deaths, years = (
            np.where(old, counts, 0.0).sum(axis=-1) for counts in (panel.deaths, panel.exposure)
        )
        weights = np.zeros(np.broadcast_shapes(panel.deaths.shape, panel.exposure.shape))
        by_death = law.per_death(ahead.slopes / ahead.expectancy[..., None])
        weights[..., within(panel.grid, SPAN)] = by_death
        weights = weights + np.where(old, 1 / deaths[..., None], 0.0)
        return cls(deaths / years * ahead.expectancy, weights)


def _rising(panel: Panel) -> Fit:
    grid, span = panel.grid, within(panel.grid, SPAN)
    deaths, exposure = panel.deaths[..., span], panel.exposure[..., span]
    found = fit(GOMPERTZ, grid.mids[span], deaths, exposure, widths=grid.widths[span])
    rises = np.where(found.slope > 0, 1.0, np.nan)[..., None]
    return replace(found, parameters=found.parameters * rises)


def _reasons(panel: Panel, whole: Panel, age: int, value: Array) -> NDArray[np.uint8]:
    old, span = np.array(panel.grid.starts) >= age, within(panel.grid, SPAN)
    low = np.full(value.shape, age < YOUNGEST)
    gaps, few = np.zeros(value.shape, bool), np.zeros(value.shape, bool)
    for side in (panel, whole):
        gaps = gaps | np.isnan(side.deaths + side.exposure).any(axis=-1)
        few = few | (side.deaths[..., old].sum(axis=-1) < LEAST_OPEN)
        few = few | (side.deaths[..., span].sum(axis=-1) < LEAST_BELOW)
    rules = (  # the first that holds is the reason
        (Reason.NOT_AVAILABLE, gaps),
        (Reason.AGE_NOT_ON_GRID, low),
        (Reason.TOO_FEW_DEATHS, few),
        (Reason.NO_LAW, ~np.isfinite(value)),
    )
    return np.select(
        [holds for _, holds in rules],
        [np.uint8(reason) for reason, _ in rules],
        np.uint8(Reason.NONE),
    )
