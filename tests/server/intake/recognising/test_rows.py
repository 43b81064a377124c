"""Where the headings stand."""

import pytest

from server.intake.recognising.rows import Heading, heading

LONG = [("Year", "Sex", "Age", "Deaths"), ("2014", "f", "0", "3"), ("2014", "f", "1", "3")]
TITLE = [("Deaths in Fenwold",), (), ("Source: civil register", "", "", "")]


@pytest.mark.parametrize(
    ("rows", "first", "count"),
    [
        (LONG, 1, 1),
        (TITLE + LONG, 4, 1),
        (LONG + LONG, 1, 1),  # repeated, as printed pages do
        ([("Printed on", "2024-01-01", "", ""), (), *LONG], 3, 1),
        # commas in a title part it like a row of headings
        ([("Table 4. Deaths by age", "Fenwold", "2019 to 2021"), *LONG], 2, 1),
        ([("Deaths by sex", "all ages", "Fenwold", "final"), *LONG], 2, 1),
        ([("Table 3",), ("Area", "Sex", "0", "1-4"), ("North", "f", "4", "5")], 2, 1),
        ([("Area", "2010", "2011", "2012"), ("North", "4", "5", "5")], 1, 1),
        ([("", "2010", "2011"), ("0", "4", "5"), ("1-4", "4", "5")], 1, 1),
        (
            [
                ("", "", "Males", "", "Females", ""),
                ("Year", "Age", "Deaths", "Population", "Deaths", "Population"),
                ("2014", "0", "3", "4", "5", "6"),
            ],
            1,
            2,
        ),
        (
            [
                ("Title",),
                ("Year", "Age", "Males", "", "Females", ""),
                ("", "", "Deaths", "Population", "Deaths", "Population"),
                ("2014", "0", "3", "4", "5", "6"),
            ],
            2,
            2,
        ),
        (
            [
                ("Title", "", "", "", "", "", "", "", ""),
                ("", "Deaths", "", "", "", "Population", "", "", ""),
                ("", "2010", "", "2011", "", "2010", "", "2011", ""),
                ("Age", "Men", "Women", "Men", "Women", "Men", "Women", "Men", "Women"),
                ("0", "3", "4", "5", "6", "7", "8", "9", "9"),
            ],
            2,
            3,
        ),
        (
            [
                ("Area", "Sex", "Age", "", "", ""),
                ("", "", "0", "1-4", "5-9", "10+"),
                ("North", "f", "4", "5", "5", "6"),
            ],
            1,
            2,
        ),
        # a blank in the first column of counts is no second row of headings
        (
            [("Area", "Year", "0-4", "5-9"), ("North", "2010", "4", "5"), ("", "2011", "6", "7")],
            1,
            1,
        ),
        ([("Kreis", "Alter", "Anzahl"), ("Nord", "0", "4"), ("", "1", "6")], 1, 1),
        # names and years of small tables are none either
        ([("area", "year", "kind", "note"), ("", "2021", "population", "other people")], 1, 1),
        ([("kind", "year"), ("population", "2021")], 1, 1),
        ([("Areas",), ("code", "becomes", "name"), ("", "deaths", "population")], 2, 1),
    ],
)
def test_headings_below_titles_and_in_several_rows(
    rows: list[tuple[str, ...]], first: int, count: int
) -> None:
    found = heading(rows)
    assert (found.first, found.rows) == (first, count)


def test_a_table_without_headings_is_not_sure_of_any() -> None:
    assert heading([("2014", "f", "0", "3"), ("2014", "f", "1", "3")]) == Heading(1, 1, sure=False)
    assert heading([]) == Heading(1, 1, sure=False)
    assert heading(LONG).sure
