"""Marks of the SDMX code list: each state of a number, and each gap, has its own."""

import pytest

from server.exports import flat, status
from server.exports.table import Column, Gap, GapKind, Row, Table

HEADS = (
    Column("age", "age", decimals=0),
    Column("deaths", "deaths", decimals=0, counted=True),
    Column("rate", "rate", decimals=1),
    Column("rate_low", "low", decimals=1, under="rate"),
    Column("rate_high", "high", decimals=1, under="rate"),
    Column("note", "note"),
)


def table(*rows: Row) -> Table:
    return Table("t", "t", HEADS, rows)


def column(of: Table, key: str) -> list[object]:
    made = flat.flat(of)
    at = made.headings.index(key)
    return [row[at] for row in made.rows]


def row(deaths: object = 3.0, rate: object = 1.0, **more: object) -> Row:
    return Row((0, deaths, rate, 0.5, 1.5, "said"), **more)  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("kind", "mark"),
    [
        (GapKind.WITHHELD, "Q"),  # missing value; suppressed
        (GapKind.NIL, "A"),
        (GapKind.NOT_AVAILABLE, "O"),  # missing value
        (GapKind.UNDEFINED, "M"),  # missing value; data cannot exist
    ],
)
def test_each_gap_has_its_mark(kind: GapKind, mark: str) -> None:
    made = table(row(rate=Gap(kind)), row(provisional=True))
    if mark == "A":
        made = table(row(rate=Gap(kind), provisional=True), row())
    assert column(made, "rate_obs_status")[0] == mark


def test_what_is_withheld_and_nothing_else_is_confidential() -> None:
    made = table(row(deaths=Gap(GapKind.WITHHELD)), row(rate=Gap(GapKind.UNDEFINED)))
    assert column(made, "deaths_conf_status") == ["C", "F"]
    assert "rate_conf_status" not in flat.flat(made).headings


@pytest.mark.parametrize(
    ("told", "mark"),
    [({}, "A"), ({"provisional": True}, "P"), ({"estimated": True}, "E")],
)
def test_a_row_has_the_mark_of_its_numbers(told: dict[str, bool], mark: str) -> None:
    assert column(table(row(**told)), "obs_status") == [mark]


def test_cells_may_have_marks_of_their_own() -> None:
    made = table(row(marks=("", "P", "E", "E", "E", "")))
    assert column(made, "obs_status") == ["E"]
    assert column(made, "deaths_obs_status") == ["P"]
    assert "rate_obs_status" not in flat.flat(made).headings


def test_a_revised_number_has_a_column_since_the_list_has_no_mark_for_it() -> None:
    assert "R" not in {*status.PRECEDENCE, *status.OF_GAPS.values()}
    assert column(table(row(revised=True), row()), "revised") == ["yes", None]


def test_of_several_marks_the_break_goes_first() -> None:
    assert status.first_of("P", "B", "E") == "B"
    assert status.first_of("P", "E", "A") == "E"
    assert status.first_of("", "P") == "P"
    assert status.first_of("") == "A"


def test_a_table_of_words_has_no_marks() -> None:
    made = Table("t", "t", (Column("a", "a"), Column("b", "b")), (Row(("x", "y")),))
    assert flat.flat(made).headings == ("a", "b")
