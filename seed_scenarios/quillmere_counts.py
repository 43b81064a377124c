"""The counts of Quillmere, an island country that is nowhere: people by age from a century of
births and death rates, and deaths drawn by chance from them.

Death rates follow published laws, added up:
  infancy and the steady hazard of adult life   Siler (1979), Ecology 60:750-757
  the hump of young men                         Heligman & Pollard (1980), JIA 107:49-80
  old age, levelling off, written by its mode   Thatcher, Kannisto & Vaupel (1998), The Force of
                                                Mortality at Ages 80 to 120; the mode after Horiuchi
                                                et al. (2013), Population Studies 67:37-48
"""

from dataclasses import dataclass, fields, replace

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

SEED = 1999
YEARS = tuple(range(1999, 2024))
SEXES = ("f", "m")
STARTS = (0, 1, *range(5, 101, 5))
_FIRST = 1880  # the projection begins here, so that nobody alive in 1999 was there at its start
_AGES = np.arange(0.0, 120.0)
REVISED = 2021
JOINED = 2005  # Tollbay was two districts up to the year before
CENSUS, REBASED = 2021, 2012  # its estimate of the population goes back to the second year
HEAT = 2018
_CLOSING, _INFANTS = 2009, 2006


@dataclass(frozen=True, slots=True)
class Region:
    """One region: its size, its shape and how its people differ from the country's."""

    code: str
    name: str
    people: float  # mid-1999
    growth: float  # of its yearly births, a year: a low one makes an old region
    later: float = 0.0  # years by which its most common age at death lies above the country's
    heat: float = 0.05  # excess of deaths at 75 and over in the hot summer, share of the year's
    infants: float = 1.0  # infant mortality before the gain, times the country's
    open_age: int = 100  # the last age group it delivers


REGIONS = (
    Region("northlade", "Northlade", 1_130_000, 0.004, later=0.3),
    Region("harrowfen", "Harrowfen", 620_000, 0.002, later=-0.7, infants=2.1),
    Region("stonereach", "Stonereach", 390_000, 0.001, later=0.4, open_age=85),
    Region("tollbay", "Tollbay", 470_000, 0.000, later=0.1),
    Region("elderwick", "Elderwick", 410_000, -0.006, later=0.7, heat=0.2),
    Region("little-auk", "Little Auk", 14_500, -0.001, later=0.2, open_age=90),
)
TOWN = Region("tollbay-town", "Tollbay Town", 290_000, 0.0)
SHORE = Region("tollbay-shore", "Tollbay Shore", 180_000, 0.0)
WHOLE = Region("quillmere", "Quillmere", sum(region.people for region in REGIONS), 0.0)


@dataclass(frozen=True, slots=True)
class Counts:
    """Deaths and mid-year population [year, sex, age] of one area; live births, stillbirths and
    deaths before 28 days [year, sex]."""

    deaths: NDArray[np.int64]
    population: NDArray[np.int64]
    births: NDArray[np.int64]
    stillbirths: NDArray[np.int64]
    neonatal_deaths: NDArray[np.int64]


def death_rates(region: Region, year: int) -> Array:
    """Death rates of one region and year by sex and single year of age, [sex, 120]."""
    rates = np.stack([_law(region, year - 1999, men=men) for men in (False, True)])
    rates[1] *= stalled(region, year)
    return np.asarray(rates * heated(region, year))


def stalled(region: Region, year: int) -> Array:
    """By how much the closing of the plant multiplies death rates of men, by single age, [120]."""
    ages, rise = _AGES + 0.5, 0.0
    if year >= _CLOSING and region.code == "tollbay":
        rise = 0.62 * min(1.0, (year - _CLOSING + 1) / 8)
    return 1 + rise * np.clip((ages - 27) / 5, 0, 1) * np.clip((62 - ages) / 5, 0, 1)


def heated(region: Region, year: int) -> Array:
    """By how much the hot summer multiplies death rates, by single age, [120]."""
    return 1 + (year == HEAT) * region.heat * np.clip((_AGES + 0.5 - 73) / 4, 0, 1)


def _law(region: Region, since: int, *, men: bool) -> Array:
    middle = _AGES + 0.5
    infant = (0.0052 if men else 0.0044) * np.exp(-0.028 * since) * _infants(region, since)
    fading = 3.4  # how fast the hazard of infancy fades, a year of age
    infancy = infant * np.exp(-fading * _AGES)
    steady = (0.00016 if men else 0.00009) * np.exp(-0.02 * since)
    hump = (0.00065 if men else 0.00013) * np.exp(-0.03 * since)
    young = hump * np.exp(-6.0 * (np.log(middle) - np.log(23.0)) ** 2)
    steep, mode = (0.106, 81.5 + 0.160 * since) if men else (0.126, 85.1 + 0.145 * since)
    old = steep * np.exp(steep * (middle - mode - region.later))
    return np.asarray(infancy + steady + young + old / (1 + old))


def _infants(region: Region, since: int) -> float:
    """Infant mortality over the country's: the surplus goes within seven years from 2006."""
    left = np.clip(1 - (since + 1999 - _INFANTS + 1) / 7, 0, 1)
    return float(1 + (region.infants - 1) * left)


def _people(region: Region) -> tuple[Array, Array]:
    """Mid-year people [year, sex, 120] and births [year, sex], before any rounding."""
    boys, people = 0.512, np.zeros((2, len(_AGES)))
    middles, births = [], []
    for year in range(_FIRST, YEARS[-1] + 1):
        rates = death_rates(region, year)
        born = np.exp(region.growth * (year - 1999)) * _wave(year) * np.array([1 - boys, boys])
        later = np.empty_like(people)
        later[:, 1:] = people[:, :-1] * np.exp(-(rates[:, :-1] + rates[:, 1:]) / 2)
        later[:, 0] = born * np.exp(-0.9 * rates[:, 0])
        middles.append((people + later) / 2)
        births.append(born)
        people = later
    shown = slice(YEARS[0] - _FIRST, None)
    scale = region.people / middles[YEARS[0] - _FIRST].sum()
    return np.stack(middles[shown]) * scale, np.stack(births[shown]) * scale


def _wave(year: int) -> float:
    """Births beside their trend: many from 1946 to 1968, fewer from 1975."""
    many = 0.35 * np.exp(-(((year - 1957) / 9) ** 2))
    fewer = 0.25 / (1 + np.exp(-(year - 1976) / 3))
    return float(1 + many - fewer)


def _grouped(single: Array) -> Array:
    return np.add.reduceat(single, STARTS, axis=-1)


def _drawn(region: Region, order: int) -> Counts:
    """What happened in one region: chance makes the deaths. `order` keys its stream."""
    people, births = _people(region)
    rates = np.stack([death_rates(region, year) for year in YEARS])
    harsh = 1 + 0.008 * np.random.default_rng([SEED, 99]).standard_normal(len(YEARS))
    expected = _grouped(people * rates) * harsh[:, None, None]
    deaths = np.random.default_rng([SEED, order]).poisson(expected)
    chance = np.random.default_rng([SEED, 20 + order])
    still = 0.0045 * np.exp(-0.015 * (np.array(YEARS) - 1999))[:, None] * births
    return Counts(
        deaths,
        np.rint(_grouped(people)).astype(np.int64),
        np.rint(births).astype(np.int64),
        chance.poisson(still),
        chance.binomial(deaths[..., 0], 0.68),
    )


def _first_reported(region: Region, counts: Counts, order: int) -> Counts:
    """What was known of it at first: of the last year one death in a hundred is not yet reported;
    of 2021 Northlade had left out deaths under inquest, most of them between 15 and 64."""
    known = np.ones(counts.deaths.shape)
    known[-1] = 0.99
    if region.code == "northlade":
        starts = np.array(STARTS)
        known[YEARS.index(REVISED)] = np.where((starts >= 15) & (starts < 65), 0.95, 0.995)
    chance = np.random.default_rng([SEED, 50 + order])
    deaths = chance.binomial(counts.deaths, known)
    early = np.minimum(counts.neonatal_deaths, deaths[..., 0])
    return replace(counts, deaths=deaths, neonatal_deaths=early)


def _with_whole(regions: list[Counts]) -> dict[str, Counts]:
    whole = Counts(
        *(
            np.sum([getattr(counts, one.name) for counts in regions], axis=0)
            for one in fields(Counts)
        )
    )
    named = {region.code: counts for region, counts in zip(REGIONS, regions, strict=True)}
    return {**named, WHOLE.code: whole}


def counted(*, revised: bool) -> dict[str, Counts]:
    """Counts by area code: as first reported, or with the revision of 2021 in Northlade; those of
    the two districts beside Tollbay."""
    happened = [_drawn(region, order) for order, region in enumerate(REGIONS)]
    known = [
        _first_reported(region, counts, order)
        for order, (region, counts) in enumerate(zip(REGIONS, happened, strict=True))
    ]
    if revised:
        at = YEARS.index(REVISED)
        known[0].deaths[at] = happened[0].deaths[at]
    together = _with_whole(known)
    return together | districts(together["tollbay"])


def districts(tollbay: Counts) -> dict[str, Counts]:
    """The counts of Tollbay as its two districts kept them: together they are what Tollbay has."""
    share = TOWN.people / (TOWN.people + SHORE.people)
    chance = np.random.default_rng([SEED, 80])
    town = Counts(
        chance.binomial(tollbay.deaths, share),
        np.rint(share * tollbay.population).astype(np.int64),
        np.rint(share * tollbay.births).astype(np.int64),
        chance.binomial(tollbay.stillbirths, share),
        chance.binomial(tollbay.neonatal_deaths, share),
    )
    least = np.maximum(0, tollbay.neonatal_deaths - (tollbay.deaths - town.deaths)[..., 0])
    early = np.clip(town.neonatal_deaths, least, town.deaths[..., 0])
    town = replace(town, neonatal_deaths=early)
    rest = {
        one.name: getattr(tollbay, one.name) - getattr(town, one.name) for one in fields(Counts)
    }
    return {TOWN.code: town, SHORE.code: Counts(**rest)}


def recounted(known: dict[str, Counts]) -> dict[str, Counts]:
    """With the population that the census found: fewer young adults, who had left without a word,
    and fewer of the oldest, of whom some had died abroad; more so the nearer to the census."""
    starts, years = np.array(STARTS), np.array(YEARS)
    away = np.where((starts >= 20) & (starts < 40), 0.035, 0.0) + np.where(starts >= 80, 0.05, 0.0)
    reach = np.clip((years - 2002) / (CENSUS - 2002), 0, 1) * (years >= REBASED)
    left = 1 - reach[:, None, None] * away
    regions = [known[region.code] for region in REGIONS]
    return _with_whole(
        [
            replace(counts, population=np.rint(counts.population * left).astype(np.int64))
            for counts in regions
        ]
    )
