"""Headings that are ages, sexes or years."""

import pytest

from server.intake.recognising.across import Across, across, meanings, number_of


@pytest.mark.parametrize(
    ("heading", "meaning"),
    [
        ("0-4", {"age": "0-4"}),
        ("85 and over", {"age": "85 and over"}),
        ("2014", {"year": "2014"}),
        ("Males", {"sex": "Males"}),
        ("Males 0-4", {"sex": "Males", "age": "0-4"}),
        ("male_0_4", {"sex": "male", "age": "0-4"}),
        ("m0", {"sex": "m", "age": "0"}),
        ("f85plus", {"sex": "f", "age": "85plus"}),
        ("M_85+", {"sex": "M", "age": "85+"}),
        ("Frauen 1 bis unter 5", {"sex": "Frauen", "age": "1 bis unter 5"}),
        ("deaths_2014", {"year": "2014", "number": "deaths"}),
        ("pop2014", {"year": "2014", "number": "population"}),
        ("Females Deaths", {"sex": "Females", "number": "deaths"}),
        (
            "2014 Males 0-4 Deaths",
            {"year": "2014", "sex": "Males", "age": "0-4", "number": "deaths"},
        ),
        ("Décès Hommes", {"sex": "Hommes", "number": "deaths"}),
    ],
)
def test_what_a_heading_says(heading: str, meaning: dict[str, str]) -> None:
    assert meaning in list(meanings(heading))


@pytest.mark.parametrize("heading", ["Area", "", "Rate 2014", "note 3", "North 0-4", "a b c d e"])
def test_headings_that_are_names_say_nothing(heading: str) -> None:
    assert list(meanings(heading)) == []


def always(_column: str) -> bool:
    return True


def test_ages_across_take_their_total_for_a_total_of_ages() -> None:
    found = across(("Area", "Sex", "Year", "0", "1-4", "5+", "Total"), always)
    assert found == Across(("age",), (("0", "0"), ("1-4", "1-4"), ("5+", "5+"), ("Total", "Total")))


def test_sexes_across_take_their_total_for_persons() -> None:
    found = across(("Year", "Age", "Males", "Females", "Total"), always)
    assert found == Across(
        ("sex",), (("Males", "Males"), ("Females", "Females"), ("Total", "Total"))
    )


def test_two_counts_and_two_sexes_are_four_columns() -> None:
    found = across(("Age", "Deaths m", "Deaths f", "Pop m", "Pop f"), always)
    assert found is not None
    assert set(found.fields) == {"sex", "number"}
    assert len(found.columns) == 4


@pytest.mark.parametrize(
    "columns",
    [
        ("year", "sex", "age", "deaths", "population"),
        ("year", "sex", "age", "0"),  # one column is no row of ages
        ("area", "2014"),
        ("year", "age", "deaths", "total"),
        ("age", "Males", "males"),  # the same twice
    ],
)
def test_a_long_table_has_nothing_across(columns: tuple[str, ...]) -> None:
    assert across(columns, always) is None


def test_of_two_ways_the_one_of_more_columns_goes_before() -> None:
    found = across(("Year", "0", "1-4", "5+", "Males", "Females"), always)
    assert found is not None
    assert found.fields == ("age",)


def test_columns_without_numbers_and_rates_are_not_across() -> None:
    assert across(("Age", "2010", "2011"), lambda column: column != "2011") is None
    found = across(("Age", "Rate 2010", "2010", "2011"), always)
    assert found is not None
    assert [column for column, _ in found.columns] == ["2010", "2011"]


def test_the_title_says_which_count_stands_in_the_cells() -> None:
    assert number_of(("", "Table 4. Deaths by age", "population.csv")) == "deaths"
    assert number_of(("Table 4",)) == ""
