"""Files as they come, each with its story: what is proposed, asked and said of them."""

from gzip import compress

import pytest

from server.intake.mapping import Form, Mapping
from server.intake.parsing import Handed, Parsed, parse
from server.intake.reading import Question, Reading, proposed, read
from tests.server.intake.tables import COLUMNS, csv, rows
from tests.server.intake.workbooks import table_cells, xlsx

TABLE = rows(years=(2013, 2014))
AGES = [str(row["age"]) for row in TABLE[:7]]
KEYS = ("area", "year", "sex", "age")


def asked(reading: Reading) -> dict[str, Question]:
    return {question.key: question for question in reading.questions}


def wide(*, decimal: str = ".") -> tuple[list[list[object]], Mapping]:
    """Deaths as a yearbook prints them: a title, years over sexes, notes below."""
    heading = [
        ["Table 3.1. Deaths by age, sex and region"],
        [],
        ["", "", "2013", "", "2014", ""],
        ["Region", "Age", "Women", "Men", "Women", "Men"],
    ]
    found = {tuple(str(row[key]) for key in KEYS): row["deaths"] for row in TABLE}
    columns = [(year, sex) for year in ("2013", "2014") for sex in "fm"]
    body = [
        [area, age, *(found[area, year, sex, age] for year, sex in columns)]
        for area in ("north", "south")
        for age in AGES
    ]
    notes = [[], ["Source: the register of deaths."], ["1) Residents only."]]
    words = {"f": "Women", "m": "Men"}
    form = Form(
        heading=3,
        heading_rows=2,
        decimal=decimal,
        across=("year", "sex"),
        across_columns=tuple((f"{year} {words[sex]}", year, sex) for year, sex in columns),
        across_number="deaths",
    )
    return [*heading, *body, *notes], Mapping(area="Region", age="Age", form=form)


def written(cells: list[list[object]], delimiter: str = ";") -> str:
    width = max(map(len, cells))
    lines = [[*map(str, row), *[""] * (width - len(row))] for row in cells]
    return "\r\n".join(delimiter.join(line) for line in lines) + "\r\n"


def deaths(parsed: Parsed) -> dict[tuple[str, ...], list[float]]:
    return {
        (key.area, key.sex, key.period): cell.values.tolist() for key, cell in parsed.cells.items()
    }


EXPECTED = {
    (area, sex, year): [
        float(str(row["deaths"]))
        for row in TABLE
        if (row["area"], row["sex"], str(row["year"])) == (area, sex, year)
    ]
    for area in ("north", "south")
    for sex in "fm"
    for year in ("2013", "2014")
}


def test_a_page_of_a_yearbook_saved_as_csv() -> None:
    """A clerk saved the printed table from a spreadsheet: title, two rows of headings, notes."""
    cells, mapping = wide()
    content = written(cells).encode()
    reading = read(content, "yearbook.csv")
    assert (reading.form.heading, reading.form.heading_rows) == (3, 2)
    assert reading.columns == ("Region", "Age", *(c[0] for c in mapping.form.across_columns))
    assert reading.top[0][0] == "Table 3.1. Deaths by age, sex and region"
    assert reading.row_count == 14
    assert reading.problems == ()
    parsed = parse([Handed("deaths", "yearbook.csv", content, mapping)])
    assert deaths(parsed) == EXPECTED
    (notes,) = [one for one in parsed.problems if one.key == "notes_left_out"]
    assert (notes.row, notes.last_row, notes.rows) == (20, 21, 2)


def test_a_workbook_with_a_cover_and_two_tables() -> None:
    """Deaths and people are on sheets of their own, behind a cover sheet with the title."""
    cells, mapping = wide()
    people = table_cells([{key: row[key] for key in (*KEYS, "population")} for row in TABLE])
    cover = [["The isle in figures"], ["Edition of May"]]
    content = xlsx(cover, name="Cover", more={"Deaths": cells, "People": people})
    reading = read(content, "isle.xlsx")
    assert [(tab.name, tab.rows, tab.columns) for tab in reading.sheets] == [
        ("Cover", 2, 1),
        ("Deaths", 21, 6),
        ("People", 57, 5),
    ]
    assert (reading.form.sheet, reading.delimiter, reading.encoding) == ("People", "", "")
    assert asked(reading)["sheet"].choices == ("Cover", "Deaths", "People")
    other = proposed(content, "isle.xlsx", Form(sheet="Deaths"))
    assert (other.form.heading, other.form.heading_rows) == (3, 2)
    assert other.name == "isle.xlsx › Deaths"
    form = Form(**{**_fields(mapping.form), "sheet": "Deaths"})
    files = [
        Handed("deaths", "isle.xlsx", content, Mapping(area="Region", age="Age", form=form)),
        Handed(
            "population",
            "isle.xlsx",
            content,
            Mapping(**{key: key for key in (*KEYS, "population")}, form=Form(sheet="People")),
        ),
    ]
    parsed = parse(files)
    assert not parsed.errors
    assert {key.measure for key in parsed.cells} == {"deaths", "person_years"}


def _fields(form: Form) -> dict[str, object]:
    return {name: getattr(form, name) for name in Form.__slots__}


def test_decimal_commas_from_a_database_in_latin_letters() -> None:
    """An old system writes Windows-1252, semicolons and decimal commas."""
    text = csv(TABLE).decode().replace(",", ";").replace("north", "Nørre – å")
    content = text.replace(";953\n", ";950,5\n").encode("windows-1252")
    reading = read(content, "old.txt")
    assert (reading.encoding, reading.delimiter_name) == ("Windows-1252", "semicolon")
    assert "encoding" not in reading.sure
    assert reading.form.decimal == ","
    assert asked(reading)["decimal"].values["example"] == "950,5"
    assert asked(reading)["decimal"].likely
    assert reading.distinct("area") == ("Nørre – å", "south")


@pytest.mark.parametrize(
    ("text", "decimal", "thousands", "likely"),
    [
        ("27.000", ",", ".", False),
        ("27,000", ".", ",", False),
        ("1.234,5", ",", ".", True),
        ("1,234.5", ".", ",", True),
        ("27 000", ".", " ", True),
        ("12.5", ".", "", True),
    ],
)
def test_marks_that_can_be_read_in_two_ways_are_asked(
    text: str, decimal: str, thousands: str, likely: bool
) -> None:
    content = csv(TABLE).replace(b",", b";").replace(b"27003", text.encode(), 1)
    reading = read(content, "a.csv")
    assert (reading.form.decimal, reading.form.thousands) == (decimal, thousands)
    assert asked(reading)["decimal"].likely == likely
    assert asked(reading)["decimal"].values["example"] == text


def test_plain_digits_ask_nothing() -> None:
    assert read(csv(TABLE), "a.csv").questions == ()


def test_people_in_thousands() -> None:
    """The heading says that figures are in thousands; nothing is multiplied before it is said."""
    content = csv(TABLE).replace(b"population", b"population (in thousands)", 1)
    question = asked(read(content, "a.csv"))["units"]
    assert (question.proposal, question.column) == ("1000", "population (in thousands)")
    mapped = {**_of(COLUMNS), "population": "population (in thousands)"}
    for units, times in ((("population", "1000"),), 1000), ((("population", "1"),), 1):
        parsed = parse([Handed("counts", "a", content, Mapping(**{**mapped, "units": units}))])
        assert not parsed.errors
        people = next(cell for key, cell in parsed.cells.items() if key.measure == "person_years")
        assert people.values[0] == 953 * times


def _of(mapping: Mapping) -> dict[str, object]:
    return {name: getattr(mapping, name) for name in Mapping.__slots__}


def test_a_block_pasted_from_a_spreadsheet() -> None:
    """What a spreadsheet puts on the clipboard: tabs between cells, quotes round line breaks."""
    text = csv(TABLE).decode().replace(",", "\t").replace("population", '"people\nat risk"', 1)
    reading = read(text.replace("\n", "\r\n").encode(), "pasted.tsv")
    assert reading.delimiter_name == "tab"
    assert reading.columns[-1] == "people at risk"
    assert (reading.row_count, reading.problems) == (56, ())


def test_a_fault_in_a_wide_table_names_row_and_heading() -> None:
    cells, mapping = wide()
    cells[7][4] = "twelve"
    cells[9][0] = ""
    parsed = parse([Handed("deaths", "a.csv", written(cells).encode(), mapping)])
    faults = {one.key: one for one in parsed.errors}
    number = faults["not_a_number"]
    assert (number.row, number.column, number.found) == (8, "2014 Women", "“twelve”")
    area = faults["unreadable_area_code"]
    assert (area.row, area.column, area.rows) == (10, "Region", 1)


def test_a_packed_file_is_looked_into() -> None:
    reading = read(compress(csv(TABLE)), "a.csv.gz")
    assert (reading.row_count, reading.problems) == (56, ())


def test_columns_without_a_name_are_called_by_their_place_or_left_out() -> None:
    content = b",year,,deaths,\nnorth,2014,,3,\nsouth,2014,,4,\n"
    assert read(content, "a.csv", Form()).columns == ("column 1", "year", "", "deaths", "")
