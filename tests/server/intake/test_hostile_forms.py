"""Files that nobody should send: each ends in a sentence, within bounds of memory."""

import tracemalloc
from dataclasses import replace

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from server.intake.forms import packages
from server.intake.forms.found import Found
from server.intake.mapping import Form, Mapping
from server.intake.parsing import Handed, parse
from server.intake.reading import read
from tests.server.intake.tables import COLUMNS, counts, csv, rows
from tests.server.intake.workbooks import SHEET, repacked, table_cells, xlsx

GOOD = csv(rows(("north",), years=(2013, 2014)))
BOOK = xlsx(table_cells(rows(("north",), years=(2013, 2014))))
MOST_TIMES = 30  # bytes of memory for each byte of a file


def first(content: bytes, **form: object) -> tuple[str, int | None, str]:
    """Kind, row and column of the first error."""
    mapped = replace(COLUMNS, form=Form(**form))  # type: ignore[arg-type]
    error = parse([Handed("counts", "a", content, mapped)]).errors[0]
    assert str(error)
    return error.key, error.row, error.column


@pytest.mark.parametrize(
    ("content", "key", "row", "column"),
    [
        (GOOD.replace(b"2014,f", b"2014,\0f", 1), "not_text", 16, ""),
        (b",".join([b"a"] * 20_000) + b"\n1\n", "too_many_columns", 1, ""),
        (GOOD.replace(b",24,", b",NaN,", 1), "not_a_number", 2, "deaths"),
        (GOOD.replace(b",24,", b",nan,", 1), "not_a_number", 2, "deaths"),
        (GOOD.replace(b",24,", b",inf,", 1), "not_finite", 2, "deaths"),
        (GOOD.replace(b",24,", b",1e999,", 1), "not_finite", 2, "deaths"),
        (GOOD.replace(b",24,", b",True,", 1), "not_a_number", 2, "deaths"),
        (GOOD.replace(b",24,", b",#REF!,", 1), "not_a_number", 2, "deaths"),
        (GOOD.replace(b",24,", b",=1+1,", 1), "not_a_number", 2, "deaths"),
        (GOOD.replace(b"population", b"deaths", 1), "doubled_heading", 1, "deaths"),
        (GOOD.replace(b"north", b'"north', 1), "stray_quote", 2, ""),
        (GOOD + b"north,2015\n", "uneven_rows", 30, ""),
        (GOOD.replace(b"1-4", b"04-Jan", 1), "date_for_age", 3, "age"),
        (b"\xff\xfe\x00\xd8", "wrong_encoding", 1, ""),
        (b"PK\x03\x04", "broken_workbook", None, ""),
        (b"\x1f\x8b", "broken_package", None, ""),
        (b"\x1f\x8b\x08\x00" + b"\0" * 40, "broken_package", None, ""),
    ],
)
def test_each_ends_in_a_sentence(content: bytes, key: str, row: int | None, column: str) -> None:
    found = first(content)
    assert found[0] == key
    if key != "broken_package":
        assert found[1:] == (row, column)


def test_letters_of_every_script_are_kept() -> None:
    name = "Île-de-Ñandú Łódź Ωμέγα 北"
    table = csv([row | {"area": name} for row in rows(("x",))])
    parsed = parse([counts(table, area="", area_name="area")])
    assert [area.name for area in parsed.areas] == [name]


@pytest.mark.parametrize(
    "content",
    [
        b"a" * 20_000_000,
        b'"' * 10_000_001,
        b"," * 10_000_000,
        b"\n" * 5_999_999,
        b"\n" * 20_000_000,
        b'a,b\n"' + b"x,\n" * 3_000_000,
        b"a,b\n" + b"1,2\n" * 2_000_000,
        "a;b\n1;\u20ac\n".encode("utf-16") * 500_000,
    ],
    ids=["line", "quotes", "signs", "blanks", "more", "unclosed", "rows", "utf-16"],
)
def test_memory_stays_within_a_bound(content: bytes) -> None:
    """Whatever stands in a file."""
    tracemalloc.start()
    parse([counts(content)])
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert peak < MOST_TIMES * len(content) + 50_000_000


def test_a_workbook_names_the_cell() -> None:
    error = repacked(BOOK, {SHEET: lambda text: text.replace(">24<", ">#N/A<", 1)})
    assert first(error) == ("not_a_number", 2, "deaths")
    infinite = repacked(BOOK, {SHEET: lambda text: text.replace(">24<", ">1E999<", 1)})
    assert first(infinite) == ("not_finite", 2, "deaths")


FORMS = st.builds(
    Form,
    encoding=st.sampled_from(["", "utf-8", "utf-16-le", "latin-1", "windows-1252", "klingon"]),
    delimiter=st.sampled_from(["", ",", ";", "\t", "|", " ", "x", ",,"]),
    sheet=st.sampled_from(["", "Counts", "x"]),
    heading=st.integers(-1, 40),
    heading_rows=st.integers(-1, 4),
    decimal=st.sampled_from([".", ",", "", ";"]),
    thousands=st.sampled_from(["", ".", ",", " ", "'", "x"]),
    across=st.lists(st.sampled_from(["age", "sex", "number", "x"]), max_size=2).map(tuple),
    across_columns=st.lists(
        st.lists(st.sampled_from(["deaths", "population", "0", "f", ""]), max_size=3).map(tuple),
        max_size=3,
    ).map(tuple),
    across_number=st.sampled_from(["", "deaths", "x"]),
)


@settings(max_examples=120, deadline=None)
@given(
    form=FORMS,
    content=st.sampled_from([GOOD, BOOK, b"", b"\n", GOOD.decode().encode("utf-16")]),
    fields=st.lists(st.sampled_from(["deaths", "population", "age", "sex", "year"]), unique=True),
    role=st.sampled_from(["counts", "deaths", "rates", "births"]),
)
def test_any_form_of_any_file_is_answered(
    form: Form, content: bytes, fields: list[str], role: str
) -> None:
    mapping = Mapping(**{f: f for f in fields}, area="area", form=form, rate_is="rate")
    assert Mapping.from_json(mapping.to_json()) == mapping
    parsed = parse([Handed(role, "a", content, mapping)])
    assert parsed.errors or parsed.cells
    assert all(str(problem) for problem in parsed.problems)
    reading = read(content, "a", form)
    assert all(reading.distinct(column) is not None for column in reading.columns)


@settings(max_examples=60, deadline=None)
@given(content=st.binary(max_size=200), head=st.sampled_from([b"", b"PK\x03\x04", b"\x1f\x8b\x08"]))
def test_any_bytes_are_proposed_a_form(content: bytes, head: bytes) -> None:
    reading = read(head + content, "a")
    assert reading.problems or reading.row_count
    assert all(question.proposal for question in reading.questions)


def test_a_long_list_of_parts_is_not_read(monkeypatch: pytest.MonkeyPatch) -> None:
    """A million parts of nothing would take ten seconds, and a record in memory each."""

    def opened(*_: object) -> None:
        raise AssertionError

    monkeypatch.setattr(packages.zipfile, "ZipFile", opened)
    found = packages.package(packages.ZIP + packages.LISTED * (packages.MOST_PARTS + 1))
    assert isinstance(found, Found)
    assert found.key == "broken_workbook"
