"""Sexes and ages against what is usual, and areas against one another."""

import pytest

from server.intake.parsing import parse
from server.intake.problems import Problem
from tests.server.intake.lives import SINGLE, lives, start, times
from tests.server.intake.tables import Row, counts, rows, where, without

AREAS = ("north", "south", "cape", "bay")
SOUND = rows()


def told(table: list[Row], key: str) -> list[Problem]:
    return [problem for problem in parse([counts(table)]).problems if problem.key == key]


@pytest.mark.parametrize(("factor", "times_told"), [(0.5, 0.5), (2.0, 2.0)])
def test_people_at_the_open_age_too_few_or_too_many(factor: float, times_told: float) -> None:
    """A population halved at 90 and over is told to be half of what the deaths imply, and so on."""
    table = times(lives(AREAS), factor, "population", ages=range(90, 99), area="cape", sex="m")
    found = told(table, "open_age_population")
    assert {problem.values["sex"] for problem in found} == {"m"}
    (problem,) = [one for one in found if one.values["area"] == "cape"]
    assert problem.values["age"] == "90+"
    assert float(problem.values["times"]) == pytest.approx(1 / times_told, rel=0.06)


@pytest.mark.parametrize(("factor", "found"), [(1.0, 0), (0.6, 1), (1.9, 1)])
def test_one_area_alone_is_set_against_the_law(factor: float, found: int) -> None:
    table = times(lives(), factor, "population", ages=range(90, 99), sex="f")
    assert len(told(table, "open_age_population")) == found


def test_sexes_are_set_side_by_side_where_both_are_there() -> None:
    """An area of men alone does not shift the others against one another."""
    alone = [row | {"area": "abbey"} for row in where(lives(), sex="m")]
    table = alone + times(lives(("north", "south")), 0.6, area="south", sex="m")
    found = told(table, "sex_ratio_of_rates")
    assert {problem.values["area"] for problem in found} == {"south"}
    (one,) = [problem for problem in found if problem.values["age"] == "all ages"]
    assert float(one.values["ratio"]) == pytest.approx(0.9, abs=0.03)  # 1.5 times 0.6


def test_an_area_far_from_the_others_is_told_within_the_usual_range() -> None:
    table = times(lives(AREAS), 1.58, area="bay", sex="m")
    (problem,) = [p for p in told(table, "sex_ratio_of_rates") if p.values["age"] == "all ages"]
    assert problem.values["area"] == "bay"
    assert float(problem.values["ratio"]) < 2.5
    few = [row for row in table if row["area"] in ("bay", "north")]
    assert told(few, "sex_ratio_of_rates") == []  # two areas have no middle


def test_rates_may_fall_where_deaths_are_few_or_people_young() -> None:
    few = times(SOUND, 0.15, area="north", ages=[85])
    assert len(told(few, "old_age_rates_fall")) == 2
    fewer = [
        row | {name: int(str(row[name])) // 20 for name in ("deaths", "population")} for row in few
    ]
    assert told(fewer, "old_age_rates_fall") == []
    young = [row for row in lives(grid=SINGLE) if True]
    assert told(times(young, 0.8, ages=[45]), "old_age_rates_fall") == []


def test_a_spike_is_one_of_a_round_age() -> None:
    table = lives(grid=SINGLE, people=2e7)
    assert [p.values["age"] for p in told(times(table, 1.08, ages=[70]), "spike_at_round_age")] == [
        "70",
        "70",
    ]
    assert told(times(table, 1.08, ages=[72]), "spike_at_round_age") == []
    assert told(times(table, 1.08, ages=[30]), "spike_at_round_age") == []
    assert told(times(table, 1.03, ages=[70]), "spike_at_round_age") == []


def test_infants_are_judged_where_the_first_years_are_told_apart() -> None:
    table = times(lives(), 0.05, ages=[0])
    assert {p.values["sex"] for p in told(table, "infant_share")} == {"f", "m"}
    joined = without(table, [row for row in table if start(row) == 1])
    assert (
        told([row | {"age": "0-4"} if start(row) == 0 else row for row in joined], "infant_share")
        == []
    )
