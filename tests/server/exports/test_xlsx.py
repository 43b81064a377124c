"""XLSX: typed cells, equal bytes for equal content, and a sheet that says what it is."""

import io
import re
import zipfile

from openpyxl import load_workbook
from openpyxl.workbook import Workbook

from server.exports import xlsx
from server.exports.table import Column, Row, Table
from tests.server.exports.tables import NAMED, a_twin


def opened(content: bytes) -> Workbook:
    return load_workbook(io.BytesIO(content))


def test_numbers_are_numbers_and_texts_are_texts() -> None:
    sheet = opened(xlsx.write(a_twin()))["years"]
    headings, first, second = list(sheet.values)[:3]
    assert headings[:4] == ("year", "area", "e0", "e0_missing")
    assert first[:3] == (2011, "=1+1", 1 / 3)
    assert sheet["B2"].data_type == "s"
    assert second[2:4] == (None, "withheld")


def test_the_first_sheet_says_what_the_file_is() -> None:
    book = opened(xlsx.write(a_twin()))
    assert book.sheetnames == ["about", "years"]
    said = {row[0]: row[1] for row in book["about"].values}
    assert said["address"] == "/c/x/1/trend?of=e0"
    assert said["Edition"] == "x, edition 1"
    assert said["Withdrawn"] == "It was withdrawn."
    assert ("column", "e0", "Saltmarsh, women", "years") in set(book["about"].values)


def test_names_behind_codes_stand_on_the_first_sheet() -> None:
    book = opened(xlsx.write(a_twin(NAMED)))
    assert ("name", "st.john", "St John") in set(book["about"].values)
    assert next(book["areas"].values) == (
        "area",
        "e0",
        "e0_missing",
        "e0_obs_status",
        "obs_status",
    )


def test_equal_content_gives_equal_bytes_at_any_time() -> None:
    content = xlsx.write(a_twin())
    assert content == xlsx.write(a_twin())
    with zipfile.ZipFile(io.BytesIO(content)) as archive:
        assert {part.date_time for part in archive.infolist()} == {(1980, 1, 1, 0, 0, 0)}
        times = re.findall(rb"\d{4}-\d\d-\d\dT", archive.read("docProps/core.xml"))
    assert times == [b"1980-01-01T"] * 2


def test_a_sign_that_xml_forbids_is_replaced() -> None:
    table = Table("t", "t", (Column("v", "v"),), (Row(("a\x07b",)), Row(("a\uffffb",))))
    cells = opened(xlsx.write(a_twin(table)))["t"]["A"]
    assert [cell.value for cell in cells[1:]] == ["a\N{REPLACEMENT CHARACTER}b"] * 2
