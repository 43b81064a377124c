"""A table in print: texts, heads, marks."""

import pytest

from server.exports.table import Column, Gap, GapKind, Row, Table
from server.pages.printed import Head, printed
from server.sentences.numbers import MINUS

WITHHELD = Gap(GapKind.WITHHELD, "fewer than 5,000 person-years")
COLUMNS = (
    Column("year", "year"),
    Column("f", "women", decimals=1, span="Saltmarsh"),
    Column("f_low", "women, low", decimals=1, under="f"),
    Column("f_high", "women, high", decimals=1, under="f"),
    Column("m", "men", unit="years", decimals=1, signed=True, span="Saltmarsh"),
)


def a_table(*rows: Row, total: Row | None = None) -> Table:
    return Table("t", "A table", COLUMNS, rows, total=total)


def test_limits_stand_under_their_number_and_shared_heads_over_their_columns() -> None:
    table = printed(a_table(Row((2012, 82.04, 81.9, 82.16, -0.25))))
    (first, saltmarsh), (women, men) = table.heads
    assert first == Head("year", rows=2, numeric=False)
    assert saltmarsh == Head("Saltmarsh", columns=2)
    assert (women.label, men.label, men.unit) == ("women", "men", "years")
    year, f, m = table.rows[0].cells
    assert (year.text, f.text, f.under) == ("2012", "82.0", "81.9 to 82.2")
    assert m.text == f"{MINUS}0.2"
    assert m.label == "Saltmarsh, men"
    assert table.widest == 3


def test_limits_of_a_difference_have_their_signs() -> None:
    columns = (
        Column("d", "difference", decimals=1, signed=True),
        Column("d_low", "low", decimals=1, signed=True, under="d"),
        Column("d_high", "high", decimals=1, signed=True, under="d"),
    )
    (row,) = printed(Table("t", "t", columns, (Row((0.3, -0.2, 0.8)),))).rows
    assert (row.cells[0].text, row.cells[0].under) == ("+0.3", f"{MINUS}0.2 to +0.8")


def test_without_shared_heads_there_is_one_line_of_heads() -> None:
    table = printed(Table("t", "t", COLUMNS[:1], (Row((2012,)),)))
    assert [len(line) for line in table.heads] == [1]


def test_a_gap_keeps_its_reason_and_calls_for_a_key() -> None:
    nil = Gap(GapKind.NIL)
    table = printed(
        a_table(Row((2012, WITHHELD, WITHHELD, WITHHELD, 1.0)), total=Row(("sum", 1, 1, 1, nil)))
    )
    assert table.rows[0].cells[1].gap == WITHHELD
    assert table.rows[0].cells[1].under_gap is None
    assert table.gaps == (GapKind.WITHHELD, GapKind.NIL)


def test_a_number_without_interval_says_so_under_it() -> None:
    gap = Gap(GapKind.UNDEFINED, "no interval")
    cell = printed(a_table(Row((2012, 82.0, gap, gap, 1.0)))).rows[0].cells[1]
    assert (cell.text, cell.under, cell.under_gap) == ("82.0", "", gap)


def test_only_numbers_are_marked_provisional() -> None:
    table = printed(a_table(Row((2012, 82.0, 81.0, 83.0, WITHHELD), provisional=True)))
    assert [cell.provisional for cell in table.rows[0].cells] == [False, True, False]
    assert table.provisional


def test_a_name_is_printed_in_place_of_the_code() -> None:
    table = printed(a_table(Row(("north", 82.0, 81.0, 83.0, 1.0), shown="North and Cape")))
    assert [cell.text for cell in table.rows[0].cells] == ["North and Cape", "82.0", "+1.0"]


def test_a_fraction_needs_decimals() -> None:
    with pytest.raises(ValueError, match=r"table t, column year: 0\.5 needs `decimals`"):
        printed(a_table(Row((0.5, 1.0, 1.0, 1.0, 1.0))))


def test_one_limit_alone_is_refused() -> None:
    with pytest.raises(ValueError, match="table t: 1 limits under f; expected low, high"):
        printed(Table("t", "t", COLUMNS[:3], ()))
