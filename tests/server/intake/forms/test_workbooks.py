"""Sheets of workbooks, against another program's reading and writing of them."""

import io
import zipfile
from collections.abc import Callable

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from openpyxl import load_workbook
from openpyxl.worksheet.worksheet import Worksheet

from server.intake.forms.lines import rows_of
from server.intake.forms.opening import opened
from server.intake.forms.sheet_rows import BETWEEN
from server.intake.forms.workbooks import workbook
from server.intake.layout import layout
from server.intake.mapping import Form
from server.intake.reading import read
from tests.server.intake.workbooks import SHEET, repacked, with_kept_values, xlsx

CELLS = [["area", "age", "deaths"], ["north", "0", 12], ["north", "1–4", 3.5]]
BOOK = xlsx(CELLS)
LINK = (
    '<Relationship Id="rId99" Target="sharedStrings.xml" Type="http://schemas.openxmlformats.org/'
    'officeDocument/2006/relationships/sharedStrings"/></Relationships>'
)
PLAIN = st.one_of(
    st.none(),
    st.integers(-(10**12), 10**12),
    st.floats(allow_nan=False, allow_infinity=False),
    st.text("ab é–<&\"'\t_x1,;", min_size=1, max_size=6).filter(str.strip),
)


def fields(content: bytes, **form: str) -> list[list[str]]:
    body = workbook(content, Form(**form)).body.decode()  # type: ignore[arg-type]
    return [list(row) for row in rows_of(body, BETWEEN)]


@settings(max_examples=40, deadline=None)
@given(st.lists(st.lists(PLAIN, min_size=1, max_size=4), min_size=1, max_size=6))
def test_values_are_those_another_program_reads(cells: list[list[object]]) -> None:
    content = xlsx(cells)
    sheet = load_workbook(io.BytesIO(content))["Counts"]
    expected = [[cell.value for cell in row] for row in sheet.iter_rows()]
    found = fields(content)
    for row, line in zip(expected, found, strict=False):
        for value, text in zip(row, line, strict=False):
            if isinstance(value, str):
                assert text == " ".join(value.split())
            else:
                assert (float(text) if text else None) == value
    assert all(value is None for row in expected[len(found) :] for value in row)


def test_numbers_are_the_ones_stored() -> None:
    content = repacked(BOOK, {SHEET: lambda text: text.replace(">12<", ">2014.0<")})
    assert fields(content)[1][2] == "2014"
    content = repacked(BOOK, {SHEET: lambda text: text.replace(">3.5<", ">1.0000000000000001E-5<")})
    assert float(fields(content)[2][2]) == 1e-5
    assert fields(BOOK, decimal=",")[2][2] == "3,5"


def test_texts_in_pieces_and_how_they_are_spoken() -> None:
    shared = (
        '<sst xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main">'
        "<si><r><t>no</t></r><r><t>rth</t></r><rPh><t>x</t></rPh></si><si><t>age</t></si></sst>"
    )
    cells = '<row><c t="s"><v>0</v></c><c t="inlineStr"><is><t>in _x0041_</t></is></c></row>'
    content = repacked(
        BOOK,
        {
            "xl/sharedStrings.xml": shared.encode(),
            "xl/_rels/workbook.xml.rels": lambda text: text.replace("</Relationships>", LINK),
            SHEET: lambda text: text.partition("<row")[0] + cells + "</sheetData></worksheet>",
        },
    )
    assert fields(content) == [["north", "in A"]]


def test_elements_may_have_a_prefix() -> None:
    """Some programs write x:row for row."""

    def prefixed(text: str) -> str:
        head, _, rest = text.partition("<worksheet")
        rest = rest.replace("</", "\0").replace("<", "<x:").replace("\0", "</x:")
        return f"{head}<x:worksheet{rest}".replace("xmlns=", "xmlns:x=", 1)

    assert fields(repacked(BOOK, {SHEET: prefixed})) == fields(BOOK)


def test_dates_are_written_as_dates() -> None:
    def dated(sheet: Worksheet) -> None:
        sheet["B3"] = 46_026
        sheet["B3"].number_format = "d-mmm"

    assert fields(xlsx(CELLS, change=dated))[2][1] == "2026-01-04"


def test_formulas_are_not_worked_out() -> None:
    def summed(sheet: Worksheet) -> None:
        sheet["C3"] = "=C2+1"

    assert fields(with_kept_values(xlsx(CELLS, change=summed)))[2][2] == "7"
    found = {one.key for one in layout(xlsx(CELLS, change=summed), "a").found}
    assert found == {"formulas_kept", "formula_without_value"}


@pytest.mark.parametrize(("heading", "told"), [(1, True), (2, True), (3, False)])
def test_formulas_above_the_heading_do_not_matter(heading: int, told: bool) -> None:
    def dated(sheet: Worksheet) -> None:
        sheet["A2"] = "=NOW()"

    file = layout(xlsx(CELLS, change=dated), "a", Form(heading=heading))
    assert ("formula_without_value" in {one.key for one in file.found}) == told


def test_what_is_merged_hidden_or_empty() -> None:
    def change(sheet: Worksheet) -> None:
        sheet.merge_cells("A2:A3")
        sheet.row_dimensions[3].hidden = True
        sheet.column_dimensions["B"].hidden = True
        sheet["F9"] = None

    file = layout(xlsx([*CELLS[:2], ["", "1–4", 3], ["south", "0", 4]], change=change), "a")
    assert file.first_rows(3)[1][:2] == ("north", "1–4")
    told = [one.fault for one in file.found if one.key == "hidden_cells"]
    assert [(one.row, one.values["what"]) for one in told] == [
        (3, "hidden rows"),
        (None, "hidden columns: B"),
    ]


def test_rows_keep_their_numbers() -> None:
    """A table that begins in C4: blank rows and columns before it."""
    blank: list[object] = [None, None]
    content = xlsx([[], [], ["Table 1"], *([*blank, *row] for row in CELLS)])
    reading = read(content, "a.xlsx")
    assert (reading.form.heading, reading.columns) == (4, ("", "", "area", "age", "deaths"))
    assert reading.problems == ()
    assert layout(content, "a", reading.form).first == 5


def test_the_largest_sheet_shown_is_proposed() -> None:
    content = xlsx([["notes"]], more={"Deaths": CELLS, "More": CELLS * 9})
    assert read(content, "a").form.sheet == "More"
    assert [one.key for one in layout(content, "a").found] == ["sheet_not_chosen"]
    assert layout(content, "a", Form(sheet="Deaths")).found == ()
    alone = repacked(content, {"xl/workbook.xml": _hide})
    assert read(alone, "a").form.sheet == "Counts"
    (told,) = [one for one in layout(alone, "a").found if one.key == "beside_the_sheet"]
    assert told.fault.values["what"] == "hidden sheets: Deaths, More"


def _hide(text: str) -> str:
    first, _, others = text.partition('name="Deaths"')
    return first + 'name="Deaths"' + others.replace('state="visible"', 'state="hidden"')


def _entities(text: str) -> str:
    bomb = "".join(
        f'<!ENTITY a{n} "{f"&a{n - 1};" * 10}">' if n else '<!ENTITY a0 "x">' for n in range(9)
    )
    return f"<!DOCTYPE a [{bomb}]>" + text.replace(">12<", ">&a8;<")


def _outside(text: str) -> str:
    return '<!DOCTYPE a [<!ENTITY e SYSTEM "file:///etc/hostname">]>' + text.replace("12", "&e;")


def _rows(row: str) -> Callable[[str], str]:
    return lambda text: text.partition("<row")[0] + row + "</sheetData></worksheet>"


@pytest.mark.parametrize(
    "change",
    [
        _entities,
        _outside,
        lambda text: text[:400],
        lambda text: "<worksheet>",
        lambda text: text.replace('t="n"', 's="x" t="n"'),
        _rows('<row r="2"/><row r="1"/>'),
        _rows('<row r="1"><c r="B1"><v>1</v></c><c r="A1"><v>1</v></c></row>'),
        _rows('<row r="1"><c r="ZZZ1"><v>1</v></c></row>'),
        _rows('<row r="9999999"><c><v>1</v></c></row>'),
        _rows('<row r="1"><c r="A1" t="s"><v>99</v></c></row>'),
        _rows('<row r="1"><c r="A1" t="s"><v>-x</v></c></row>'),
        _rows('<row r="x"/>'),
    ],
)
def test_a_sheet_that_no_program_writes_is_refused(change: Callable[[str], str]) -> None:
    (found,) = opened(repacked(BOOK, {SHEET: change}), Form()).found
    assert found.key == "broken_workbook"


@pytest.mark.parametrize("part", ["xl/workbook.xml", "_rels/.rels", "xl/styles.xml", SHEET])
def test_a_part_that_is_lacking_or_damaged_is_told(part: str) -> None:
    assert opened(repacked(BOOK, {part: b"\0\1"}), Form()).found[0].key == "broken_workbook"


def test_zipped_files_that_are_no_workbooks() -> None:
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w") as archive:
        archive.writestr("mimetype", "application/vnd.oasis.opendocument.spreadsheet")
    (found,) = opened(stream.getvalue(), Form()).found
    assert (found.key, found.fault.values["what"]) == ("not_text", "an OpenDocument file")


@settings(max_examples=40, deadline=None)
@given(st.integers(0, len(BOOK) - 1), st.binary(max_size=4))
def test_a_damaged_workbook_is_read_or_told(at: int, scrap: bytes) -> None:
    file = layout(BOOK[:at] + scrap + BOOK[at + len(scrap) :], "a.xlsx")
    assert file.found or file.columns == ("area", "age", "deaths")
