"""Numbers that stand twice: how unlikely that is, and which of them is told."""

import math

import numpy as np
import pytest

from server.intake.checks.repeats import _proof, _unit
from server.intake.parsing import parse
from server.intake.problems import Problem
from tests.server.intake.doubts import copied, stood
from tests.server.intake.lives import lives
from tests.server.intake.tables import Row, counts, rows, where

SOUND = rows()
WOMEN = where(SOUND, area="north", year=2012, sex="f")


def told(table: list[Row], key: str) -> list[Problem]:
    return [problem for problem in parse([counts(table)]).problems if problem.key == key]


def by_hand(*counted: float) -> float:
    """Level, slope and what lies off the middle of its neighbours, each no more than chance."""
    chance = [math.sqrt(4 * math.pi * one) for one in counted]
    off = [
        abs(counted[at] - (counted[at - 1] + counted[at + 1]) / 2)
        for at in range(1, len(counted) - 1)
    ]
    rough = [min(1 + 2 * one, chance[at + 1]) for at, one in enumerate(off)]
    slope = min(1 + abs(counted[-1] - counted[0]), chance[-1])
    return sum(map(math.log, [chance[0], slope, *rough]))


@pytest.mark.parametrize(
    "counted",
    [(1000, 1000, 1000, 1000, 1000), (1000, 990, 980, 970, 960), (31, 28, 40, 22, 35), (9, 0.5, 7)],
)
def test_a_repetition_proves_as_much_as_its_numbers_are_free(counted: tuple[float, ...]) -> None:
    assert float(_proof(np.array(counted, float), 1.0)) == pytest.approx(by_hand(*counted))


def test_a_smooth_line_proves_little_and_a_rough_one_much() -> None:
    level = 0.5 * math.log(4 * math.pi * 1000)
    assert float(_proof(np.full(10, 1000.0), 1.0)) == pytest.approx(level)
    rough = np.random.default_rng(1).poisson(1000, 10).astype(float)
    assert float(_proof(rough, 1.0)) > 6 * level


@pytest.mark.parametrize(("values", "unit"), [([12, 5], 1), ([120, 50], 10), ([3e3, 12e3], 1e3)])
def test_rounded_numbers_count_in_what_they_are_rounded_to(
    values: list[float], unit: float
) -> None:
    assert _unit(np.array([values])) == unit


def test_a_year_is_repeated_within_its_area_and_copied_from_another() -> None:
    """Three times the same: twice in the north, once more in the south."""
    table = SOUND
    for area, year in (("north", 2013), ("south", 2011)):
        to = where(SOUND, area=area, year=year, sex="f")
        table = copied(table, where(table, area=area, year=year, sex="f"), WOMEN, "population")
        assert len(to) == 7
    (repeated,) = told(table, "year_repeated")
    assert [repeated.values[one] for one in ("area", "same", "years")] == ["north", "2012", "2013"]
    (alike,) = told(table, "counts_copied")
    assert [alike.values[one] for one in ("area", "year", "ages")] == ["south", "2011", 7]
    assert [alike.values[one] for one in ("other_area", "other_year")] == ["north", "2012"]


def test_a_year_that_repeats_one_that_stands_is_found() -> None:
    new = [row | {"year": 2015} for row in WOMEN]
    found = parse([counts(new)], stood(SOUND)).problems
    repeated = [problem for problem in found if problem.key == "year_repeated"]
    assert [problem.column for problem in repeated] == ["deaths", "population"]
    assert {problem.values["years"] for problem in repeated} == {"2015"}
    again = parse([counts(WOMEN)], stood(SOUND)).problems  # the same year handed in again
    assert [problem.key for problem in again if problem.key == "year_repeated"] == []


def test_a_whole_with_a_single_part_is_no_copy() -> None:
    north = lives()
    whole = [row | {"area": "isle"} for row in north]
    assert parse([counts(north + whole, whole="isle")]).problems == ()
    apart = told(north + whole, "counts_copied")
    assert apart
    assert {problem.values["other_area"] for problem in apart} == {"isle"}


def test_two_areas_of_one_year_with_the_same_numbers_repeat_no_year() -> None:
    south = [row | {"area": "south"} for row in WOMEN]
    assert told(WOMEN + south, "year_repeated") == []
    assert len(told(WOMEN + south, "counts_copied")) == 2  # deaths and population
