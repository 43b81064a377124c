"""CSV: what another program reads back is what the table held."""

import csv as reader
import io

import pytest
from hypothesis import given
from hypothesis import strategies as st

from server.exports import csv
from server.exports.table import Column, Row, Table
from tests.server.exports.tables import NAMED, YEARS


def read(content: bytes) -> list[dict[str, str]]:
    return list(reader.DictReader(io.StringIO(content.decode(), newline="")))


def test_the_bytes_of_a_table_with_every_kind_of_cell() -> None:
    assert csv.write(YEARS).decode() == (
        "year,area,e0,e0_missing,e0_obs_status,e0_conf_status,change,change_missing,remark,"
        "provisional,obs_status\r\n"
        "2011,'=1+1,0.3333333333333333,,A,F,-0.125,,,,A\r\n"
        '2012,"a ""quoted"", name",,withheld,Q,C,0.5,,,yes,P\r\n'
        '2013,"line\nbreak",82.0,,A,F,,nil,a remark,,A\r\n'
        "sum,,82.5,,A,F,0.375,,,,A\r\n"
    )


def test_a_name_which_may_change_is_left_out() -> None:
    assert csv.write(NAMED).decode() == (
        "area,e0,e0_missing,e0_obs_status,obs_status\r\n"
        "st.john,80.5,,A,A\r\ncape,,not available,O,A\r\n"
    )


def one_column(*values: float | str) -> Table:
    return Table("t", "t", (Column("v", "v"),), tuple(Row((value,)) for value in values))


@given(value=st.floats(allow_nan=False, allow_infinity=False))
def test_a_number_comes_back_to_the_last_bit(value: float) -> None:
    assert float(read(csv.write(one_column(value)))[0]["v"]) == value


@given(text=st.text(st.characters(exclude_categories=["Cs"], exclude_characters="\x00")))
def test_no_text_begins_as_a_formula_and_every_other_comes_back(text: str) -> None:
    rows = list(reader.reader(io.StringIO(csv.write(one_column(text)).decode(), newline="")))
    came = rows[1][0] if len(rows) > 1 and rows[1] else ""
    assert not came.startswith(("=", "+", "-", "@", "\t", "\r", "\n"))
    assert came in (text, f"'{text}")


@pytest.mark.parametrize("sign", ["=", "+", "-", "@", "\t", "\r", "\n"])
def test_each_sign_that_begins_a_formula_is_kept_from_it(sign: str) -> None:
    rows = list(reader.reader(io.StringIO(csv.write(one_column(f"{sign}1")).decode(), newline="")))
    assert rows[1] == [f"'{sign}1"]


def test_a_negative_number_is_not_taken_for_a_formula() -> None:
    assert csv.write(one_column(-1.5)) == b"v\r\n-1.5\r\n"


def test_a_number_that_is_none_must_have_been_a_gap() -> None:
    with pytest.raises(ValueError, match="table t, column v: found nan; expected a number or a"):
        csv.write(one_column(float("nan")))


def test_a_row_of_another_length_is_refused() -> None:
    table = Table("t", "t", (Column("v", "v"),), (Row((1, 2)),))
    with pytest.raises(ValueError, match="row 1 of table t has 2 cells; it has 1 columns"):
        csv.write(table)
