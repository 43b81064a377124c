"""The counts of Quillmere, before any upload: sums, chance, and what the stories rest on."""

import csv
import io
from dataclasses import fields

import numpy as np
import pytest

from seed_scenarios.quillmere_counts import (
    JOINED,
    REBASED,
    REGIONS,
    REVISED,
    SHORE,
    STARTS,
    TOWN,
    WHOLE,
    YEARS,
    Counts,
    counted,
    death_rates,
    districts,
    recounted,
)
from seed_scenarios.quillmere_files import births_csv, deaths_csv, population_csv

AREAS = (*(region.code for region in REGIONS), WHOLE.code)
PARTS = (*REGIONS, TOWN, SHORE)
REGION = {region.code: region for region in REGIONS}


@pytest.fixture(scope="module")
def first() -> dict[str, Counts]:
    return counted(revised=False)


@pytest.fixture(scope="module")
def revised() -> dict[str, Counts]:
    return counted(revised=True)


def rows(content: bytes) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(content.decode(), newline="")))


def test_the_same_seed_gives_the_same_files(first: dict[str, Counts]) -> None:
    again = counted(revised=False)
    assert deaths_csv(again, YEARS, AREAS) == deaths_csv(first, YEARS, AREAS)
    assert population_csv(again, YEARS, AREAS) == population_csv(first, YEARS, AREAS)
    assert births_csv(again, YEARS, AREAS) == births_csv(first, YEARS, AREAS)


@pytest.mark.parametrize("measure", ["deaths", "population", "births"])
def test_the_whole_is_the_sum_of_its_regions(first: dict[str, Counts], measure: str) -> None:
    parts = sum(getattr(first[region.code], measure) for region in REGIONS)
    assert np.array_equal(getattr(first[WHOLE.code], measure), parts)


def test_a_region_closes_its_ages_where_it_says(first: dict[str, Counts]) -> None:
    table = rows(deaths_csv(first, YEARS, AREAS))
    ends = {row["area"]: row["age"] for row in table if row["age"].endswith("+")}
    assert ends == {
        **dict.fromkeys((*AREAS, TOWN.code, SHORE.code), "100+"),
        "stonereach": "85+",
        "little-auk": "90+",
    }
    for code in AREAS:
        codes = {code, TOWN.code, SHORE.code} if code == "tollbay" else {code}
        written = sum(int(row["deaths"]) for row in table if row["area"] in codes)
        assert written == first[code].deaths.sum(), code


def test_only_the_last_year_is_provisional(first: dict[str, Counts]) -> None:
    status = {row["year"]: row["status"] for row in rows(deaths_csv(first, YEARS, AREAS))}
    assert [year for year, word in status.items() if word == "provisional"] == ["2023"]
    assert set(status.values()) == {"final", "provisional"}


def test_the_revision_adds_deaths_in_one_region_and_year_only(
    first: dict[str, Counts], revised: dict[str, Counts]
) -> None:
    at = YEARS.index(REVISED)
    for code in AREAS:
        added = revised[code].deaths - first[code].deaths
        assert np.array_equal(revised[code].population, first[code].population)
        if code in ("northlade", WHOLE.code):
            assert 80 <= added[at].sum() <= 250
            assert np.all(added[at] >= 0)
            added[at] = 0
        assert not added.any(), code


def test_enough_people_and_deaths_for_the_figures_that_are_promised(
    first: dict[str, Counts],
) -> None:
    assert 2.9e6 < first[WHOLE.code].population[0].sum() < 3.2e6
    auk = first["little-auk"].population.sum(axis=-1)
    assert np.all((auk > 5_000) & (auk < 9_000))
    for code in AREAS:
        open_age = REGION.get(code, WHOLE).open_age
        last = first[code].deaths[..., STARTS.index(open_age) :].sum(axis=-1)
        assert np.all(last >= 1), code


def test_the_planted_causes_are_in_the_rates() -> None:
    tollbay, northlade = REGION["tollbay"], REGION["northlade"]
    for year, factor in ((2008, 1.0), (2009, 1.0775), (2016, 1.62), (2023, 1.62)):
        steady = death_rates(northlade, year)[1, 45] / death_rates(northlade, 2008)[1, 45]
        there = death_rates(tollbay, year)[1, 45] / death_rates(tollbay, 2008)[1, 45]
        assert there / steady == pytest.approx(factor, rel=0.01)
    hot = death_rates(REGION["elderwick"], 2018) / death_rates(REGION["elderwick"], 2017)
    assert np.all(hot[:, 80:100] > 1.15)
    assert np.all(hot[:, 40:70] < 1)
    infants = [death_rates(REGION["harrowfen"], year)[0, 0] for year in (2005, 2013)]
    assert infants[1] < 0.5 * infants[0]


def test_the_districts_of_tollbay_are_tollbay(first: dict[str, Counts]) -> None:
    parts = districts(first["tollbay"])
    for one in fields(Counts):
        numbers = [getattr(parts[code.code], one.name) for code in (TOWN, SHORE)]
        assert np.array_equal(numbers[0] + numbers[1], getattr(first["tollbay"], one.name))
        assert all(np.all(counts >= 0) for counts in numbers)
    for counts in parts.values():
        assert np.all(counts.neonatal_deaths <= counts.deaths[..., 0])
    table = rows(deaths_csv(first, YEARS, AREAS))
    years = {code.code: {int(r["year"]) for r in table if r["area"] == code.code} for code in PARTS}
    assert years[TOWN.code] == years[SHORE.code] == set(range(1999, JOINED))
    assert years["tollbay"] == set(range(JOINED, 2024))


def test_the_census_finds_fewer_young_adults_and_fewer_of_the_oldest(
    revised: dict[str, Counts],
) -> None:
    after = recounted(revised)
    since = YEARS.index(REBASED)
    starts = np.array(STARTS)
    away = ((starts >= 20) & (starts < 40)) | (starts >= 80)
    for code in AREAS:
        before, now = revised[code].population, after[code].population
        assert np.array_equal(before[:since], now[:since])
        assert np.array_equal(before[since:, :, ~away], now[since:, :, ~away])
        assert now[since:, :, away].sum() < 0.99 * before[since:, :, away].sum()
        assert np.array_equal(revised[code].deaths, after[code].deaths)
