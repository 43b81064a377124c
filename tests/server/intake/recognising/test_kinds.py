"""What a file holds, told by its columns, else by the words around it."""

import pytest

from server.intake.reading import read
from server.intake.recognising.kinds import COLUMNS_SAY, TITLE_SAYS, Kind, kind, kinds, sorted_out
from tests.server.intake.workbooks import xlsx

DEATHS = b"year,sex,age,deaths\n2014,f,0,3\n"
PEOPLE = b"year,sex,age,population\n2014,f,0,900\n"
MUTE = b"year,sex,age,x\n2014,f,0,900\n"


@pytest.mark.parametrize(
    ("content", "role"),
    [
        (DEATHS, "deaths"),
        (PEOPLE, "population"),
        (b"year,sex,age,deaths,person-years\n2014,f,0,3,900\n", "counts"),
        (b"year,sex,births,stillbirths,deaths under 28 days\n2014,f,900,3,2\n", "births"),
        (b"year,sex,age,qx\n2014,f,0,0.003\n", "rates"),
        (b"year,sex,age,deaths,rate per 1000\n2014,f,0,3,3.3\n", "deaths"),
        (b"year,age,deaths_m,deaths_f,pop_m,pop_f\n2014,0,3,4,900,901\n", "counts"),
        ("Jahr;Alter;Geschlecht;Bevölkerung\n2014;0;m;900\n".encode(), "population"),
        (b"year,sex,age,rate per 100 000,population\n2014,f,0,330,900\n", "rates"),
        (MUTE, ""),
    ],
)
def test_columns_say_what_a_file_holds(content: bytes, role: str) -> None:
    assert kind(read(content, "a.csv")) == Kind(role, COLUMNS_SAY if role else "")


def test_else_its_title_or_its_name_does() -> None:
    wide = b"Table 2. Deaths by age\n\nage,2014,2015\n0,3,4\n1+,5,6\n"
    assert kind(read(wide, "a.csv")) == Kind("deaths", TITLE_SAYS)
    assert kind(read(MUTE, "population-2014.csv")) == Kind("population", TITLE_SAYS)


def test_sheets_of_different_kinds_are_files_of_their_own() -> None:
    deaths, people = (
        [("year", "sex", "age", what), (2014, "f", "0", 3)] for what in ("deaths", "population")
    )
    more = {"People": people, "Notes": [("Compiled by hand.",)]}
    both = xlsx(deaths, name="Deaths", more=more)
    assert [(one.role, one.sheet) for one in kinds(both, "book.xlsx")] == [
        ("deaths", "Deaths"),
        ("population", "People"),
    ]
    twice = xlsx(deaths, name="North", more={"South": deaths})
    assert [one.role for one in kinds(twice, "book.xlsx")] == ["deaths"]


def test_files_are_sorted_out() -> None:
    found = sorted_out([("b.csv", PEOPLE), ("a.csv", DEATHS)])
    assert found.files == (("population", "b.csv", PEOPLE), ("deaths", "a.csv", DEATHS))
    assert found.twice == ()


def test_a_file_that_does_not_tell_takes_the_place_that_is_left() -> None:
    found = sorted_out([("a.csv", MUTE), ("b.csv", DEATHS)])
    assert [(role, name) for role, name, _ in found.files] == [
        ("deaths", "b.csv"),
        ("population", "a.csv"),
    ]
    assert sorted_out([("a.csv", MUTE)], ["deaths"]).files[0][0] == "population"


def test_two_files_of_a_kind_are_told() -> None:
    assert sorted_out([("a.csv", DEATHS), ("b.csv", DEATHS)]).twice == (("deaths", "b.csv"),)
    assert sorted_out([("b.csv", DEATHS)], ["deaths"]).twice == (("deaths", "b.csv"),)
