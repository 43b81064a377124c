"""The words of a table."""

import pytest

from server.intake.areas import code_of, is_code
from server.intake.labels import ALL_AGES, Age, read_age, read_sex, read_status, read_year


@pytest.mark.parametrize(
    ("text", "age"),
    [
        ("0", Age(0)),
        ("00", Age(0)),
        ("7.0", Age(7)),
        ("<1", Age(0, 0)),
        ("Under 1", Age(0, 0)),
        ("under 1 year", Age(0, 0)),
        ("less than 5", Age(0, 4)),
        ("1-4", Age(1, 4)),
        ("01–04", Age(1, 4)),
        ("1 − 4 years", Age(1, 4)),
        ("5 to 9", Age(5, 9)),
        ("Age 5", Age(5)),
        ("85+", Age(85, None, True)),
        ("85 +", Age(85, None, True)),
        ("90 years and over", Age(90, None, True)),
        ("aged 85 or older", Age(85, None, True)),
        ("85 plus", Age(85, None, True)),
        ("≥100", Age(100, None, True)),
        (">= 100", Age(100, None, True)),
        ("All ages", ALL_AGES),
        ("Total", ALL_AGES),
    ],
)
def test_ages_as_people_write_them(text: str, age: Age) -> None:
    assert read_age(text) == age


@pytest.mark.parametrize(
    "text", ["", "4-1", "-5", "131", "1-4-9", "04-Jan", "5.5", "<0", "85++", "1,4", "x1"]
)
def test_what_is_no_age(text: str) -> None:
    assert read_age(text) is None


@pytest.mark.parametrize(
    ("sex", "texts"),
    [
        ("f", ["f", "F", "female", "Females", "women", "Woman", "w"]),
        ("m", ["m", "Male", "males", "men", "man"]),
        ("p", ["p", "persons", "total", "Both sexes", "all", " both "]),
        (None, ["1", "2", "", "F/M", "x", "mf", "h", "v", "9"]),
    ],
)
def test_sexes_as_people_write_them(sex: str | None, texts: list[str]) -> None:
    assert {read_sex(text) for text in texts} == {sex}


def test_the_files_own_codes_go_first() -> None:
    codes = (("1", "m"), ("2", "f"), ("W", "m"))
    assert [read_sex(text, codes) for text in ("1", "2", "w", "women")] == ["m", "f", "m", "f"]


def test_years_and_states() -> None:
    assert [read_year(text) for text in ("2014", " 2014.0 ", "14", "3014", "2014/15", "")] == [
        2014,
        2014,
        None,
        None,
        None,
        None,
    ]
    assert [read_status(text) for text in ("Final", "p", "provisional", "r", "")] == [
        "final",
        "provisional",
        "provisional",
        None,
        None,
    ]


@pytest.mark.parametrize(
    ("name", "code"),
    [
        ("North Shore", "north-shore"),
        ("Østre Mýrland (north)", "ostre-myrland-north"),
        ("Straße", "strasse"),
        ("x" * 60, "x" * 32),
        ("a" * 31 + " b", "a" * 31),
    ],
)
def test_codes_are_made_of_names(name: str, code: str) -> None:
    assert code_of(name) == code
    assert is_code(code)


def test_a_name_that_cannot_be_folded_still_has_a_code_of_its_own() -> None:
    assert code_of("東の島") != code_of("西の島")
    assert is_code(code_of("東の島"))
