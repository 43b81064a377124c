"""Deaths by cause that lack something: to whom they go."""

import numpy as np
import pytest

from server.intake.causes.counted import Counted
from server.intake.parsing import Parsed, parse
from server.intake.report import Report
from server.store.records import Key
from tests.server.intake.by_cause import by_cause
from tests.server.intake.tables import Row

SHARED = (("sex", "spread"), ("age", "spread"), ("area", "spread"))
AGES = ("0-44", "45-64", "65+")


def read(*table: Row) -> Parsed:
    return parse([by_cause(list(table), unstated=SHARED, most_unstated=100)], warn=False)


def row(sex: str, age: str, cause: str, deaths: float, area: str = "north") -> Row:
    named: Row = {"area": area, "year": 2020, "sex": sex, "age": age}
    return {**named, "cause": cause, "deaths": deaths}


STATED = [
    row(sex, age, cause, deaths)
    for cause, by_sex in {
        "I21": {"f": (2, 10, 40), "m": (6, 30, 40)},
        "W19": {"f": (1, 1, 4)},
    }.items()
    for sex, counts in by_sex.items()
    for age, deaths in zip(AGES, counts, strict=True)
]


def at(parsed: Parsed, sex: str, cause: str, measure: str = "deaths") -> list[float]:
    return [*map(float, parsed.cells[Key("north", sex, "2020", measure, cause)].values)]


def test_a_death_of_unknown_sex_goes_by_its_own_cause() -> None:
    parsed = read(*STATED, row("unknown", "45-64", "I21", 4))
    assert at(parsed, "f", "heart-attack") == [2, 11, 40]  # 10 and 30 stated: one and three of four
    assert at(parsed, "m", "heart-attack") == [6, 33, 40]
    assert at(parsed, "f", "falls") == [1, 1, 4]
    assert at(parsed, "f", "") == [3, 12, 44]
    assert at(parsed, "f", "heart-attack", "counted_deaths") == [2, 10, 40]


def test_a_fall_goes_to_women_where_women_alone_fell() -> None:
    parsed = read(*STATED, row("unknown", "65+", "W19", 3))
    assert at(parsed, "f", "falls") == [1, 1, 7]
    assert Key("north", "m", "2020", "deaths", "falls") not in parsed.cells


def test_a_cause_stated_nowhere_goes_by_all_causes() -> None:
    parsed = read(*STATED, row("unknown", "65+", "X44", 2.1))
    assert at(parsed, "f", "overdose") == pytest.approx([0, 0, 2.1 * 44 / 84], abs=1e-6)
    assert at(parsed, "m", "overdose") == pytest.approx([0, 0, 2.1 * 40 / 84], abs=1e-6)
    assert at(parsed, "m", "overdose", "counted_deaths") == [0, 0, 0]


def test_what_befalls_one_sex_alone_goes_to_that_sex() -> None:
    parsed = read(*STATED, row("unknown", "65+", "C61", 2), row("unknown", "0-44", "O99", 1))
    assert at(parsed, "m", "cancer-prostate") == [0, 0, 2]
    assert at(parsed, "f", "pregnancy") == [1, 0, 0]


def test_deaths_without_a_cause_are_shared_out_too() -> None:
    parsed = read(*STATED, row("unknown", "45-64", "cause not stated", 8.2))
    more = 8.2 * 11 / 41  # of 11 women and 30 men who died at that age
    assert at(parsed, "f", "") == pytest.approx([3, 11 + more, 44], abs=1e-6)
    assert at(parsed, "f", "heart-attack") == [2, 10, 40]


def test_unknown_ages_and_areas_go_by_their_cause() -> None:
    far = [row(sex, age, "W19", 12, "south") for sex in "fm" for age in AGES]
    parsed = read(
        *STATED, *far, row("f", "unknown", "I21", 52), row("f", "65+", "W19", 4, "unknown")
    )
    assert at(parsed, "f", "heart-attack") == [4, 20, 80]
    assert at(parsed, "f", "falls") == [1, 1, 5]  # 4 of 16 women of that age fell in the north


def test_all_that_is_lacking_is_told_by_cause() -> None:
    parsed = read(*STATED, row("unknown", "45-64", "I21", 4), row("m", "65+", "unknown", 5))
    told = Report.of(parsed).by_cause
    assert told == (
        Counted("heart-attack", "Heart attack and ischaemic heart", 132.0, 4.0),
        Counted("falls", "Falls", 6.0, 0.0),
        Counted("", "", 5.0, 0.0),
    )
    assert Report.from_json(Report.of(parsed).to_json()).by_cause == told
    assert np.isclose(sum(one.deaths for one in told), 138 + 5)
