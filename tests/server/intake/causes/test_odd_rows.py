"""Where causes begin and cease to be possible, and who had none of them."""

import pytest

from server.intake.causes.lists import SHORT
from server.intake.causes.profiles import Profiles, steps
from server.intake.parsing import parse
from server.intake.standing import Standing
from server.store.records import Break
from tests.server.intake.by_cause import by_cause, own
from tests.server.intake.tables import Row

AGES = ("0", "1-4", "5-9", "10-14", "15-69", "70+")


def found(cause: str, age: str, sex: str = "f", deaths: int = 1, **mapping: object) -> set[str]:
    """Checks that one row trips."""
    table: list[Row] = [
        {"area": "north", "year": 2020, "sex": sex, "age": one, "cause": "I21", "deaths": 1}
        for one in AGES
    ]
    table.append({**table[0], "age": age, "cause": cause, "deaths": deaths})
    listed = (own("a,Heart,,I00-I99", "b,Rest,,A00-H99 J00-R99"),)
    files = [by_cause(table, **mapping), *(listed if mapping else ())]
    keys = {one.key for one in parse(files).problems}
    return keys & {"cause_at_odd_age", "cause_of_other_sex", "not_underlying_cause"}


@pytest.mark.parametrize(
    ("cause", "possible"),
    [
        ("R95", ("0",)),
        ("P07", ("0", "1-4")),
        ("O95", ("5-9", "10-14", "15-69")),
        ("F03", ("15-69", "70+")),
        ("X64", ("5-9", "10-14", "15-69", "70+")),
        ("Y87.0", ("5-9", "10-14", "15-69", "70+")),
        ("C34", AGES),
    ],
)
def test_ages_at_which_a_cause_can_be(cause: str, possible: tuple[str, ...]) -> None:
    assert tuple(age for age in AGES if not found(cause, age)) == possible


@pytest.mark.parametrize(
    ("cause", "sex", "told"),
    [
        ("C61", "f", True),
        ("C61", "m", False),
        ("C61", "p", False),
        ("C56", "m", True),
        ("C50", "m", False),
        ("N40", "f", True),
        ("O95", "m", True),
        ("Prostate cancer", "f", True),
    ],
)
def test_a_cause_of_one_sex(cause: str, sex: str, told: bool) -> None:
    assert found(cause, "15-69", sex) == ({"cause_of_other_sex"} if told else set())


def test_a_row_without_deaths_is_no_doubt() -> None:
    assert found("O95", "70+", "m", deaths=0) == set()


def test_rules_in_codes_of_icd_10_are_for_lists_by_icd_10() -> None:
    assert found("R95", "70+") == {"cause_at_odd_age"}
    assert found("R95", "70+", cause_list="own") == set()


@pytest.mark.parametrize(
    ("period", "area", "cause", "changed"),
    [
        ("2014", "", "", True),
        ("2014", "north", "stroke", True),
        ("2014", "south", "", False),
        ("2014", "", "falls", False),
        ("2013", "", "", False),
        ("2015", "", "", False),
    ],
)
def test_a_break_of_coding_explains_a_step_into_its_year(
    period: str, area: str, cause: str, changed: bool
) -> None:
    stated = (Break(area, period, "coding", cause),)
    profiles = Profiles(SHORT, {}, Standing(), stated)
    assert profiles.coding_changed("north", 2013, 2014, "stroke") == changed
    assert not list(steps(profiles))
