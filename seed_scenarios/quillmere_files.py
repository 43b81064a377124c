"""The files the statistical office of Quillmere hands in: CSV in long form, one row a count."""

from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from seed_scenarios.quillmere_counts import (
    HEAT,
    JOINED,
    REBASED,
    REGIONS,
    SEXES,
    SHORE,
    STARTS,
    TOWN,
    WHOLE,
    YEARS,
    Counts,
    Region,
)

WORDS = {"f": "women", "m": "men"}
PROVISIONAL = YEARS[-1]


def deaths_csv(counted: dict[str, Counts], years: tuple[int, ...], areas: tuple[str, ...]) -> bytes:
    """Deaths by year, area, sex and age, with the year's status."""
    lines = ["year,status,area,area_name,sex,age,deaths"]
    for region, year, sex, at in _cells(years, areas):
        status = "provisional" if year == PROVISIONAL else "final"
        deaths = closed(region, counted[region.code].deaths[at])
        lines += [
            f"{year},{status},{region.code},{region.name},{WORDS[sex]},{age},{count}"
            for age, count in zip(ages(region), deaths, strict=True)
        ]
    return text(lines)


def population_csv(
    counted: dict[str, Counts],
    years: tuple[int, ...],
    areas: tuple[str, ...],
    *,
    districts: bool = True,
) -> bytes:
    """Residents on 1 July by year, area, sex and age."""
    lines = ["year,area,area_name,sex,age,population"]
    for region, year, sex, at in _cells(years, areas, districts=districts):
        people = closed(region, counted[region.code].population[at])
        lines += [
            f"{year},{region.code},{region.name},{WORDS[sex]},{age},{count}"
            for age, count in zip(ages(region), people, strict=True)
        ]
    return text(lines)


def births_csv(
    counted: dict[str, Counts],
    years: tuple[int, ...],
    areas: tuple[str, ...],
    *,
    districts: bool = True,
) -> bytes:
    """Live births, stillbirths and deaths before 28 days by year, area and sex of the child."""
    lines = ["year,area,area_name,sex,births,stillbirths,neonatal_deaths"]
    for region, year, sex, at in _cells(years, areas, districts=districts):
        counts = counted[region.code]
        numbers = (counts.births[at], counts.stillbirths[at], counts.neonatal_deaths[at])
        where = (year, region.code, region.name, WORDS[sex])
        lines.append(",".join(map(str, (*where, *numbers))))
    return text(lines)


def areas_csv() -> bytes:
    """What became of the codes of Tollbay's two districts."""
    before = JOINED - 1
    return text(
        [
            "code,becomes,from,to,name",
            f"{TOWN.code},tollbay,,{before},Tollbay",
            f"{SHORE.code},tollbay,,{before},",
        ]
    )


def breaks_csv() -> bytes:
    """The new population base, and the year of the hot summer."""
    return text(
        [
            "area,year,kind,note",
            f",{REBASED},population,after the census of 2021",
            f",{HEAT},shock,hot summer",
        ]
    )


def _cells(
    years: tuple[int, ...], areas: tuple[str, ...], *, districts: bool = True
) -> list[tuple[Region, int, str, tuple[int, int]]]:
    """Every area, year and sex asked for, with its place in the arrays; Tollbay by its districts
    where there were two, unless they are added up already."""
    return [
        (part, year, sex, (YEARS.index(year), row))
        for region in (*REGIONS, WHOLE)
        if region.code in areas
        for year in years
        for part in ((TOWN, SHORE) if districts and _parted(region, year) else (region,))
        for row, sex in enumerate(SEXES)
    ]


def _parted(region: Region, year: int) -> bool:
    return region.code == "tollbay" and year < JOINED


def ages(region: Region) -> list[str]:
    starts = STARTS[: STARTS.index(region.open_age) + 1]
    closed = [
        str(start) if end - start == 1 else f"{start}-{end - 1}" for start, end in pairwise(starts)
    ]
    return [*closed, f"{region.open_age}+"]


def closed(region: Region, counts: NDArray[np.int64]) -> NDArray[np.int64]:
    """Counts [age, ...] with everyone from the region's open age in one group."""
    last = STARTS.index(region.open_age)
    return np.concatenate([counts[:last], counts[last:].sum(axis=0, keepdims=True)])


def text(lines: list[str]) -> bytes:
    return ("\r\n".join(lines) + "\r\n").encode()
