"""Cutting a text into lines and fields; headings of several rows; notes below."""

import csv
import io

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from server.intake.forms.delimiters import delimited, without_blanks
from server.intake.forms.headings import joined
from server.intake.forms.lines import filled, lines, taken
from server.intake.forms.notes import notes

FIELDS = st.text(st.sampled_from('ab1 ,;"\n'), max_size=5)
TABLES = st.lists(st.lists(FIELDS, min_size=2, max_size=4), min_size=1, max_size=6)


def as_csv(table: list[list[str]]) -> bytes:
    stream = io.StringIO()
    csv.writer(stream, quoting=csv.QUOTE_ALL, lineterminator="\n").writerows(table)
    return stream.getvalue().encode()


@given(TABLES)
def test_fields_are_counted_as_they_were_written(table: list[list[str]]) -> None:
    cut = lines(as_csv(table), ",")
    assert cut.stray == 0
    assert cut.fields.tolist() == [len(row) for row in table]


@given(TABLES, st.integers(0, 7))
def test_rows_are_taken_as_they_were_written(table: list[list[str]], count: int) -> None:
    found = taken(as_csv(table), 0, count, ",")
    assert [list(row) for row in found.rows] == table[:count]
    assert not found.torn
    assert taken(as_csv(table), found.end, 9, ",").rows == tuple(map(tuple, table[count:]))


@given(st.lists(st.tuples(*[st.sampled_from(["", "1", '"a,b"'])] * 3), min_size=1, max_size=5))
def test_columns_that_hold_something(rows: list[tuple[str, ...]]) -> None:
    body = "".join(",".join(row) + "\n" for row in rows).encode()
    found = filled(body, lines(body, ","), ",", 3)
    assert found.tolist() == [any(column) for column in zip(*rows, strict=True)]


@pytest.mark.parametrize(
    ("text", "sign", "sure"),
    [
        ("a,b\n1,2\n", ",", True),
        ("a;b;c\n1,5;2;3,5\n1,5;2;3,5\n", ";", False),
        ("Deaths, by age, isle\n\na|b|c\n1|2|3\n4|5|6\n", "|", True),
        ("a\tb\n1\t2\n", "\t", True),
        ('"a;b;c;d",e\n"1;2;3;4",5\n', ",", True),
        ("one\n", ",", True),
        ("t;i;t;le\na;b\n1;2,5\n3;4,5\n", ";", True),
    ],
)
def test_the_sign_that_cuts_most_evenly(text: str, sign: str, sure: bool) -> None:
    found = delimited(text.encode())
    assert (found.delimiter, found.sure) == (sign, sure)


def test_runs_of_blanks_outside_quotes() -> None:
    assert without_blanks(b'  a   b "c  d"  \n1 2\t3\n') == b'a\tb\t"c  d"\n1\t2\t3\n'


def test_an_upper_heading_holds_until_the_next() -> None:
    rows = [("", "2013", "", "2014"), ("", "Women", "Men", "Women"), ("Age", "n", "n", "n")]
    assert joined(rows) == ("Age", "2013 Women n", "2013 Men n", "2014 Women n")
    assert joined([("a", "b"), ("", "", "c")]) == ("a", "b", "b c")
    assert joined([]) == ()


TABLE = "north,0,1\nnorth,1+,2\n"


@pytest.mark.parametrize(
    ("below", "line"),
    [
        ("", None),
        ("\nSource: register\n", 3),
        ("\n\n", None),
        ("\nRevised figures\n,,\nSecond note\n", 3),
        ("* provisional\n", 2),
        ("1) residents only\n", 2),
        ("Source: register, 2014\n", 2),
        ("Figures of the last year are provisional,,\n", 2),
        ("south,1+\n", None),  # a row cut short
        ("85 and over,,\n", None),  # a group without counts
        ("total\n", None),
        ("5,,\n", None),
        ("\nsouth,0,3\n", None),
        ("Source: register\nsouth,0,3\n", None),
    ],
)
def test_notes_are_what_is_plainly_one(below: str, line: int | None) -> None:
    body = (TABLE + below).encode()
    found = notes(body, lines(body, ","), ",", 3)
    assert (found and found.line) == line


def test_a_text_without_a_table_is_no_note() -> None:
    body = b"Source: one\nSource: two\n"
    found = notes(body, lines(body, ","), ",", 3)
    assert found is None or found.line > 0
    assert notes(b"", lines(b"", ","), ",", 3) is None
    assert not np.any(lines(b"\n,,\n", ",").fields)
