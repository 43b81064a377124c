"""Tables read back: numbers as people print them, and files as they are saved here."""

import io

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from openpyxl import Workbook

from server.exports import csv, json, xlsx
from server.exports.table import Column, Gap, GapKind, Row, Table
from server.exports.twin import Twin
from server.results.keys import BadValue
from server.results.printed_tables import PrintedNumber, columns_of, number, read
from server.sentences.numbers import number as printed

TABLE = Table(
    "estimates",
    "Figures",
    (Column("area", "area"), Column("year", "year"), Column("value", "value", decimals=1)),
    (
        Row(("north", "2014", 81.2345)),
        Row(("cape", "2014", Gap(GapKind.WITHHELD))),
    ),
)
ADDRESS = "/c/isle/2/trend?of=e0&area=north"
TWIN = Twin("A trend", ADDRESS, (("Settings", "almanac-1: x"),), (), (), (TABLE,))


@given(value=st.floats(-1e4, 1e4), decimals=st.integers(0, 6))
def test_what_is_printed_is_of_its_value(value: float, decimals: int) -> None:
    found = number(printed(value, decimals, signed=True))
    assert found is not None
    assert found.decimals == decimals
    assert found.is_of(value)
    assert not found.is_of(value + 1.01 * 10.0**-decimals)
    whole = number(repr(value))
    assert whole is not None
    assert whole.is_of(value)


@pytest.mark.parametrize("text", ["", "withheld", "–", "1.2.3", "12 years", "1e", "0x10"])
def test_what_is_no_number(text: str) -> None:
    assert number(text) is None


def test_digits_cut_off_are_told_from_rounded_ones() -> None:
    found = number("81.2")
    assert found == PrintedNumber(81.2, 1)
    assert not found.is_of(81.29)
    assert found.is_cut_from(81.29)
    assert not found.is_cut_from(81.31)


@pytest.mark.parametrize(
    ("name", "content"),
    [("t.xlsx", xlsx.write(TWIN)), ("t.json", json.write(TWIN)), ("t.csv", csv.write(TABLE))],
)
def test_a_saved_file_says_what_it_says(name: str, content: bytes) -> None:
    found = read(content, name)
    assert found.address == ("" if name == "t.csv" else ADDRESS)
    (table,) = found.tables
    assert table.key == ("" if name == "t.csv" else "estimates")
    first, second = table.rows
    assert (first.texts["area"], first.texts["year"]) == ("north", "2014")
    value = number(first.texts["value"])
    assert value is not None
    assert np.isclose(value.value, 81.2345, rtol=1e-12)
    assert second.texts["value"] == ""


def test_lines_above_the_table_tell_what_it_is() -> None:
    content = (
        b"title,Figures\naddress,/c/isle/2/trend?of=e0\n\narea,sex,year,value\nnorth,f,2014,81.2\n"
    )
    found = read(content, "t.csv")
    assert (found.address, found.said["title"]) == ("/c/isle/2/trend?of=e0", "Figures")
    (table,) = found.tables
    assert table.headings == ("area", "sex", "year", "value")
    assert (table.rows[0].number, table.rows[0].texts["value"]) == (5, "81.2")


def test_other_signs_and_sheets() -> None:
    semicolons = "Area;Sex;Year;Indicator;Value\nnorth;f;2014;e0;81.2\n".encode("utf-16")
    (table,) = read(semicolons, "t.csv").tables
    assert columns_of(table) == {
        "area": "Area",
        "sex": "Sex",
        "year": "Year",
        "indicator": "Indicator",
        "value": "Value",
    }
    book = Workbook()
    book.active.append(["area", "sex", "year", "value"])
    book.active.append(["north", "f", 2014, 81.2])
    raw = io.BytesIO()
    book.save(raw)
    (table,) = read(raw.getvalue(), "t.xlsx").tables
    assert table.rows[0].texts == {"area": "north", "sex": "f", "year": "2014", "value": "81.2"}


@pytest.mark.parametrize("content", [b"", b"\n\n", b"{}", b'{"figures": 3}', b"%PDF-1.7", b"{" * 9])
def test_what_holds_no_table(content: bytes) -> None:
    with pytest.raises(BadValue, match="no table was found"):
        read(content, "t")
