"""Of what the people of Quillmere die: the deaths drawn for each region parted into causes by
chance, so that causes add up to them exactly.

The shares of causes by age are of our own invention; in their course over age they are like those
of many countries: injuries in young adults, cancers in late middle age, heart, brain and mind in
old age (Preston (1976), Mortality Patterns in National Populations, describes the pattern).
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from seed_scenarios.quillmere_counts import (
    REGIONS,
    SEED,
    STARTS,
    YEARS,
    Array,
    Counts,
    Region,
    heated,
    stalled,
)

# Little Auk and Stonereach close their ages at 90 and 85, and so would the sum of all
MAINLAND = tuple(region for region in REGIONS if region.open_age == STARTS[-1])
RECODED = 2011  # from this year on the office codes by new rules
LOST, GAINED = "pneumonia", "dementia"  # a part of the first is the second by the new rules,
PART, OLDER = 0.2, 50  # at this age and over

_ANCHORS = (0.5, 3, 10, 20, 30, 40, 50, 60, 70, 80, 90, 102)  # ages to which the weights belong


@dataclass(frozen=True, slots=True)
class Cause:
    """The weight of one cause among deaths, for each of the ages above; how it differs by sex, and
    by how much it changes a year."""

    code: str
    weights: tuple[float, ...]
    men: float = 1.0
    women: float = 1.0
    trend: float = 0.0


CAUSES = (
    Cause("hiv-tuberculosis", (0, 0, 0, 3, 12, 14, 8, 4, 2, 1, 1, 0), women=0.5, trend=-0.03),
    Cause("infections-other", (20, 60, 25, 9, 8, 9, 10, 10, 10, 10, 11, 12)),
    Cause("cancer-lung", (0, 0, 0, 1, 5, 22, 75, 110, 95, 55, 20, 6), women=0.6, trend=-0.006),
    Cause("cancer-breast", (0, 0, 0, 2, 60, 150, 140, 95, 60, 36, 24, 16), men=0.004),
    Cause("cancer-bowel", (0, 0, 0, 3, 12, 25, 40, 48, 45, 36, 22, 12), women=1.05),
    Cause("cancer-prostate", (0, 0, 0, 0, 0, 1, 8, 26, 42, 50, 38, 22), women=0.0),
    Cause("cancer-other", (10, 130, 190, 75, 90, 150, 220, 250, 225, 150, 80, 40), women=1.25),
    Cause("tumours-other", (4, 20, 20, 6, 6, 6, 7, 7, 7, 7, 7, 6)),
    Cause(
        "heart-attack",
        (0, 0, 0, 4, 25, 95, 165, 185, 175, 165, 150, 130),
        women=0.55,
        trend=-0.022,
    ),
    Cause("stroke", (3, 8, 12, 10, 16, 30, 38, 45, 60, 85, 90, 80), women=1.25, trend=-0.018),
    Cause("circulatory-other", (15, 30, 30, 35, 50, 70, 75, 80, 90, 125, 185, 230), women=1.05),
    Cause("pneumonia", (12, 35, 20, 12, 14, 16, 16, 20, 30, 55, 90, 130)),
    Cause("lungs-chronic", (3, 10, 12, 8, 8, 12, 25, 50, 75, 65, 35, 18), women=0.8),
    Cause("respiratory-other", (8, 10, 8, 4, 4, 6, 8, 12, 17, 20, 19, 16), women=0.9),
    Cause("respiratory-acute", (12, 20, 8, 2, 2, 2, 2, 3, 4, 6, 9, 12)),
    Cause("liver-alcohol", (0, 0, 0, 3, 35, 75, 70, 40, 14, 3, 1, 0), women=0.6),
    Cause("digestive-other", (12, 15, 15, 14, 24, 36, 40, 36, 32, 33, 34, 34), women=1.1),
    Cause("dementia", (0, 0, 0, 0, 0, 1, 4, 10, 28, 75, 125, 120), women=1.6, trend=0.025),
    Cause("mind-nerves-other", (25, 100, 110, 60, 45, 38, 32, 30, 32, 28, 22, 18), women=0.9),
    Cause("diabetes", (1, 5, 8, 10, 14, 18, 24, 27, 27, 22, 16, 10), women=0.9),
    Cause("kidney", (4, 5, 5, 4, 5, 6, 8, 10, 14, 18, 20, 20)),
    Cause("diseases-other", (25, 90, 60, 35, 30, 28, 26, 24, 24, 26, 32, 40), women=1.2),
    Cause("pregnancy", (0, 0, 0, 12, 30, 12, 0, 0, 0, 0, 0, 0), men=0.0),
    Cause("perinatal", (520, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0)),
    Cause("congenital", (240, 110, 60, 20, 12, 9, 6, 4, 2, 1, 0, 0), women=1.05),
    Cause("sudden-infant", (70, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0), women=0.8, trend=-0.03),
    Cause("road-traffic", (6, 90, 170, 260, 130, 60, 28, 15, 8, 5, 2, 1), women=0.7, trend=-0.03),
    Cause("suicide", (0, 0, 30, 230, 230, 130, 65, 26, 9, 4, 2, 1), women=0.7),
    Cause("overdose", (2, 10, 10, 110, 140, 75, 22, 7, 3, 1, 1, 1), women=0.6, trend=0.01),
    Cause("violence", (10, 25, 15, 30, 28, 14, 6, 3, 1, 1, 0, 0), women=0.6, trend=-0.02),
    Cause("falls", (2, 10, 12, 14, 16, 16, 14, 12, 12, 17, 26, 36), women=0.9, trend=0.01),
    Cause("external-other", (22, 110, 130, 60, 50, 34, 22, 16, 13, 13, 15, 18), women=0.5),
    Cause("undetermined", (2, 5, 10, 32, 34, 22, 10, 4, 2, 1, 1, 1), women=0.8),
)
ILL_DEFINED, PENDING = "ill-defined", "pending"
CODES = (*(cause.code for cause in CAUSES), ILL_DEFINED, PENDING)

# of the deaths that came on top of what would have been
_AFTER_CLOSING = {"overdose": 0.4, "suicide": 0.3, "liver-alcohol": 0.3}
_OF_HEAT = {
    "heart-attack": 0.3,
    "circulatory-other": 0.25,
    "stroke": 0.1,
    "lungs-chronic": 0.2,
    "pneumonia": 0.15,
}


def shares(region: Region, year: int) -> Array:
    """Of the deaths of one region and year at each age the shares of CODES, [sex, age, cause]."""
    usual = _usual(year)
    story = np.stack([np.ones_like(heated(region, year)), stalled(region, year)])
    found = _on_top(usual, story, _AFTER_CLOSING)
    found = _on_top(found, heated(region, year)[None], _OF_HEAT)
    if year >= RECODED:
        moved = PART * (np.array(STARTS) >= OLDER) * found[..., CODES.index(LOST)]
        found[..., CODES.index(LOST)] -= moved
        found[..., CODES.index(GAINED)] += moved
    ill, pending = ill_defined(year), _pending(year)
    found *= (1 - ill - pending)[..., None]
    found[..., CODES.index(ILL_DEFINED)] = ill
    found[..., CODES.index(PENDING)] = pending
    return found


def ill_defined(year: int) -> float:
    """The share of deaths whose cause is ill-defined: less and less, as certificates get better."""
    return 0.09 - 0.06 * (year - YEARS[0]) / (YEARS[-1] - YEARS[0])


def _pending(year: int) -> Array:
    """The share of deaths, by age, that wait for their cause: those of the last year, most of them
    of the young, into whose deaths there are inquests."""
    starts = np.array(STARTS)
    return np.where(starts < 65, 0.1, 0.02) * (year == YEARS[-1])


def _usual(year: int) -> Array:
    """Shares without any story; the last two causes have none yet."""
    middles = (np.array(STARTS) + np.array([*STARTS[1:], 104])) / 2
    weights = np.stack([np.interp(middles, _ANCHORS, cause.weights) for cause in CAUSES], axis=-1)
    sexes = np.array([[cause.women for cause in CAUSES], [cause.men for cause in CAUSES]])
    trends = np.exp((year - YEARS[0]) * np.array([cause.trend for cause in CAUSES]))
    weights = weights * (sexes * trends)[:, None]
    only = np.stack([np.array(STARTS) == 0 for _ in CAUSES], axis=-1)
    infant = np.array([cause.code in ("perinatal", "sudden-infant") for cause in CAUSES])
    weights = np.where(infant & ~only, 0.0, weights)
    none = np.zeros((*weights.shape[:-1], 2))
    return np.concatenate([weights / weights.sum(axis=-1, keepdims=True), none], axis=-1)


def _on_top(usual: Array, times: Array, causes: dict[str, float]) -> Array:
    """Shares where deaths were multiplied, by single age [sex or 1, 120], and what came on top was
    of these causes."""
    widths = np.diff([*STARTS, times.shape[-1]])
    more = np.add.reduceat(times, STARTS, axis=-1) / widths
    on_top = (1 - 1 / more)[..., None]
    split = np.array([causes.get(code, 0.0) for code in CODES])
    return np.asarray((1 - on_top) * usual + on_top * split)


def parted(counts: Counts, region: Region) -> NDArray[np.int64]:
    """The deaths of one region by cause, [year, sex, age, cause]."""
    order = REGIONS.index(region)
    expected = np.stack([shares(region, year) for year in YEARS])
    drawn = np.random.default_rng([SEED, 110 + order]).multinomial(counts.deaths, expected)
    return np.asarray(drawn, np.int64)


@dataclass(frozen=True, slots=True)
class Ratio:
    """Deaths of a cause by the new rules over those by the old, and its standard error."""

    ratio: float
    error: float


def comparability(by_cause: dict[str, NDArray[np.int64]]) -> dict[str, Ratio]:
    """What the office found when it coded the deaths of the year before by the old rules and by the
    new ones. The error is that of the deaths that moved, a binomial number."""
    deaths = np.sum([one[YEARS.index(RECODED - 1)] for one in by_cause.values()], axis=(0, 1))
    lost, gained = (int(deaths[:, CODES.index(code)].sum()) for code in (LOST, GAINED))
    older = deaths[STARTS.index(OLDER) :, CODES.index(LOST)].sum()
    moved = int(np.random.default_rng([SEED, 130]).binomial(older, PART))
    error = float(np.sqrt(moved * (1 - moved / older)))
    return {
        LOST: Ratio(1 - moved / lost, error / lost),
        GAINED: Ratio(1 + moved / gained, error / gained),
    }
