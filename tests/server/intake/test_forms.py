"""The same table in every form gives the same schedules."""

from dataclasses import replace
from gzip import compress

import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from server.intake.mapping import Form
from server.intake.parsing import Parsed, parse
from tests.server.intake.forms.written import Written, handed, table

ROWS = table()
PLAIN = parse([handed(ROWS, Written())])
PEOPLE = replace(handed(ROWS, Written()), role="population", name="people.csv")
ENCODINGS = [
    ("utf-8", False),
    ("utf-8", True),
    ("utf-16-le", True),
    ("utf-16-be", True),
    ("utf-16-le", False),
    ("utf-16-be", False),
    ("windows-1252", False),
]
ACROSS = st.sampled_from(
    [
        (),
        ("age",),
        ("sex",),
        ("year",),
        ("number",),
        ("sex", "age"),
        ("year", "sex"),
        ("year", "number"),
        ("sex", "age", "number"),
        ("year", "sex", "age", "number"),
    ]
)


def same(parsed: Parsed) -> None:
    expected = PLAIN.cells
    assert not parsed.errors, [str(error) for error in parsed.errors]
    assert parsed.cells.keys() == expected.keys()
    for key, cell in expected.items():
        found = parsed.cells[key]
        assert (found.status, found.grid, found.estimated) == (cell.status, cell.grid, False)
        assert found.values.tobytes() == cell.values.tobytes()


def test_the_plain_file_says_what_was_written() -> None:
    assert not PLAIN.errors
    assert [area.name for area in PLAIN.areas] == sorted({str(row["area"]) for row in ROWS})
    first = next(cell for key, cell in PLAIN.cells.items() if key.measure == "person_years")
    women = [row["population"] for row in ROWS if row["sex"] == "f" and row["year"] == "2010"]
    assert first.values.tolist() == women[: len(first.values)]


@settings(max_examples=30, deadline=None)
@given(
    encoding=st.sampled_from(ENCODINGS),
    delimiter=st.sampled_from(",;\t|"),
    marks=st.sampled_from([(".", ""), (",", ""), (",", "."), (".", ","), (".", " "), (".", "'")]),
    across=ACROSS,
    deep=st.booleans(),
    titles=st.integers(0, 3),
    notes=st.integers(0, 2),
    end=st.sampled_from(["\n", "\r\n"]),
    packed=st.booleans(),
    workbook=st.booleans(),
)
def test_every_form_of_a_table_says_the_same(
    encoding: tuple[str, bool],
    delimiter: str,
    marks: tuple[str, str],
    across: tuple[str, ...],
    deep: bool,
    titles: int,
    notes: int,
    end: str,
    packed: bool,
    workbook: bool,
) -> None:
    assume(not (packed and workbook))
    how = Written(
        encoding=encoding[0],
        mark=encoding[1],
        delimiter=delimiter,
        decimal=marks[0],
        thousands=marks[1],
        across=across,
        heading_rows=max(len(across), 1) if deep else 1,
        titles=titles,
        notes=notes,
        end=end,
        packed=packed,
        workbook=workbook,
    )
    counts = handed(ROWS, how)
    if across and "number" not in across:  # a table of deaths alone; people in a file of their own
        parsed = parse([replace(counts, role="deaths"), PEOPLE])
    else:
        parsed = parse([counts])
    same(parsed)
    told = {problem.key for problem in parsed.problems}
    assert ("notes_left_out" in told) == bool(notes)


@pytest.mark.parametrize("across", [(), ("sex", "age", "number")])
def test_blanks_part_fields_where_they_are_chosen(across: tuple[str, ...]) -> None:
    """Columns of unequal width, as a printed table has them."""
    rows = [row | {"area": str(row["area"]).split()[0]} for row in ROWS]
    plain = parse([handed(rows, Written())])
    counts = handed(rows, Written(delimiter="\t", across=across, heading_rows=1))
    lines = counts.content.decode().replace(" ", "_").replace("\t", "    ")
    columns = tuple(
        (heading.replace(" ", "_"), *values)
        for heading, *values in counts.mapping.form.across_columns
    )
    form = Form(delimiter=" ", across=across, across_columns=columns)
    mapping = replace(counts.mapping, form=form)
    parsed = parse([replace(counts, content=lines.encode(), mapping=mapping)])
    assert not parsed.errors
    assert parsed.cells.keys() == plain.cells.keys()


def test_a_packed_file_in_parts_is_read_whole() -> None:
    """Some programs pack a file piece by piece."""
    counts = handed(ROWS, Written())
    half = len(counts.content) // 2
    content = compress(counts.content[:half]) + compress(counts.content[half:]) + b"\0" * 512
    same(parse([replace(counts, content=content)]))
