"""Counts out of line with the years around them."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from server.intake.cells import place_of
from server.intake.checks.jumps import AIM, LIMITS, SPREAD, local_level, tail
from server.intake.parsing import parse
from server.intake.problems import Problem
from server.intake.standing import Standing
from tests.server.intake.doubts import stood
from tests.server.intake.lives import SINGLE, lives, numbered, start, times
from tests.server.intake.tables import YEARS, Row, counts, deaths, rows, setting, where, without

SOUND = rows()
NORTH = where(SOUND, area="north", year=2012, sex="f")
GROUPS = 8  # seven ages and all together


def problems(table: list[Row], standing: Standing | None = None) -> list[Problem]:
    found = parse([counts(table)], standing).problems
    return [problem for problem in found if problem.key.startswith("jump")]


@pytest.mark.parametrize("dispersion", [1.0, 1.35, 4.0, 60.0])
@pytest.mark.parametrize(("level", "count"), [(24.0, 50), (24.0, 6), (3.0, 14), (640.0, 900)])
def test_the_tail_is_that_of_the_negative_binomial_law(
    dispersion: float, level: float, count: int
) -> None:
    if dispersion == 1:
        law = stats.poisson(level)
    else:
        law = stats.nbinom(level / (dispersion - 1), 1 / dispersion)
    assert law.var() == pytest.approx(dispersion * level)
    expected = 2 * (law.sf(count - 1) if count > level else law.cdf(count))
    found = tail(np.array(float(count)), np.array(level), np.array(dispersion))
    assert float(found) == pytest.approx(expected, rel=1e-6)


def test_few_infants_trip_where_a_negative_binomial_law_says_so() -> None:
    """The median of the four years around is 24, their own dispersion under that of chance."""
    law = stats.nbinom(24 / (SPREAD - 1), 1 / SPREAD)
    first = int(law.isf(AIM / GROUPS / 2)) + 1
    assert first > 24 * (1 + LIMITS["deaths"].at_an_age)
    picked = where(NORTH, age="0")
    assert problems(setting(SOUND, picked, deaths=first - 1)) == []
    (found,) = problems(setting(SOUND, picked, deaths=first + 1))
    assert (found.key, found.values["found"], found.values["usual"]) == (
        "jump_of_deaths",
        first + 1,
        24,
    )
    assert found.values["spread"] == round(float(np.sqrt(SPREAD * 25)))


@pytest.mark.parametrize(
    ("deaths", "trips"), [(835, False), (836, True), (451, False), (448, True)]
)
def test_many_deaths_trip_beyond_their_share(deaths: int, trips: int) -> None:
    """The years around let expect 641 to 643: 30 % are 193."""
    found = problems(setting(SOUND, where(NORTH, age="85+"), deaths=deaths))
    assert [problem.key for problem in found] == ["jump_of_deaths"] * trips


@pytest.mark.parametrize("year", [2010, 2012, 2014])
def test_a_jump_is_found_in_the_first_and_last_year_too(year: int) -> None:
    picked = where(SOUND, area="north", year=year, sex="f", age="85+")
    (problem,) = problems(setting(SOUND, picked, deaths=1_300))
    assert (problem.key, problem.values["year"]) == ("jump_of_deaths", str(year))


def test_two_years_are_too_few_to_judge_either() -> None:
    table = rows(years=(2013, 2014))
    assert problems(setting(table, where(table, year=2014, age="85+"), deaths=1_300)) == []


def test_one_year_is_judged_by_those_that_stand() -> None:
    last = where(SOUND, year=2014)
    off = setting(last, where(last, area="north", sex="f", age="85+"), deaths=1_300)
    assert problems(off) == []
    (problem,) = problems(off, stood(SOUND))
    assert (problem.key, problem.values["usual"], problem.row) == ("jump_of_deaths", 643, 8)
    assert problems(last, stood(SOUND)) == []
    assert problems(last, stood(setting(SOUND, last, deaths=1))) == []  # what it takes the place of


def test_coarser_years_that_stand_judge_all_ages_alone() -> None:
    coarse = [row | {"age": "0"} if row["age"] == "0" else row for row in SOUND]
    joined = without(coarse, [row for row in coarse if row["age"] in ("65-84", "85+")])
    old = [
        {**row, "age": "65+", **{n: numbered(row, n) + numbered(last, n) for n in names}}
        for names in [("deaths", "population")]
        for row, last in zip(where(SOUND, age="65-84"), where(SOUND, age="85+"), strict=True)
    ]
    last = where(SOUND, year=2014)
    base = stood(joined + old)
    assert [
        one.key for one in problems(times(last, 1.4, area="north", sex="f", ages=[85]), base)
    ] == []
    (problem,) = problems(times(last, 1.4, area="north", sex="f"), base)
    assert problem.values["age"] == "all ages"


def test_a_year_off_does_not_make_its_neighbours_look_off() -> None:
    for years in (YEARS, range(2010, 2013)):
        table = rows(("north",), years=years, sexes="f")
        picked = where(table, year=years[1], age="85+")
        found = problems(setting(table, picked, deaths=2_000))
        assert [problem.values["year"] for problem in found] == [str(years[1])]


def test_a_year_that_is_off_at_all_ages_is_one_problem() -> None:
    (problem,) = problems(times(SOUND, 4 / 3, area="north", year=2012, sex="f"))
    assert problem.values["age"] == "all ages"


def test_an_area_whose_years_differ_is_given_more_room() -> None:
    """Deaths up and down by a quarter from year to year: a half more is then no surprise."""
    uneven = SOUND
    for number, year in enumerate(YEARS):
        uneven = times(uneven, (0.8, 1.25)[number % 2], area="north", sex="f", year=year, ages=[45])
    spoilt = where(uneven, area="north", sex="f", year=2011, age="45-64")
    even = where(SOUND, area="north", sex="f", year=2011, age="45-64")
    assert problems(setting(SOUND, even, deaths=390)) != []
    assert problems(setting(uneven, spoilt, deaths=390)) == []


def test_deaths_may_follow_their_population() -> None:
    """A town that grows by a half: its deaths follow. Deaths alone that grow do not pass."""
    grown = SOUND
    for name in ("population", "deaths"):
        grown = times(grown, 1.9, name, area="north", year=2012, sex="f", ages=[15])
    assert {one.key for one in problems(grown)} == {"jump_of_population", "jump_of_deaths"}
    slowly = SOUND
    for number, year in enumerate(YEARS):
        for name in ("population", "deaths"):
            slowly = times(slowly, 1.24**number, name, area="north", year=year, ages=[45])
    assert [one.key for one in problems(slowly)] == []
    without_people = [deaths(slowly)]
    assert "jump_of_deaths" not in {
        one.key for one in parse(without_people, stood(slowly)).problems
    }


def test_a_large_year_of_birth_is_no_jump_as_it_grows_old() -> None:
    table = lives(grid=SINGLE)
    born = [row for row in table if int(str(row["year"])) - start(row) == 1971]
    for name in ("population", "deaths"):
        table = [row | {name: 2 * numbered(row, name)} if row in born else row for row in table]
    assert problems(table) == []
    alone = times(lives(grid=SINGLE), 2, "population", ages=[33], year=2004, sex="f")
    assert [one.key for one in problems(alone)] == ["jump_of_population"]


@given(
    st.lists(st.integers(2000, 2012), min_size=1, max_size=9, unique=True),
    st.integers(0, 2**32),
)
def test_the_local_level_is_the_middle_of_the_years_around(years: list[int], seed: int) -> None:
    years.sort()
    place = place_of(
        np.repeat([0, 1], len(years)), np.zeros(2 * len(years), int), np.tile(years, 2)
    )
    values = np.random.default_rng(seed).poisson(50.0, (len(place), 2)).astype(float)
    level = local_level(values, place)
    for line, at in enumerate(place):
        near = [one for one in range(len(place)) if one != line and abs(place[one] - at) <= 2]
        for column in range(2):
            if len(near) < 2:
                assert np.isnan(level[line, column])
                continue
            around = sorted(values[near, column])
            low, high = around[(len(around) - 1) // 2], around[len(around) // 2]
            assert level[line, column] == np.clip(values[line, column], low, high)
