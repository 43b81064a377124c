"""Wide tables made long: what each count is of, and where it stands."""

from dataclasses import replace

import pytest

from server.intake.forms.across import spread
from server.intake.forms.addresses import WIDE, addresses, placed
from server.intake.layout import layout
from server.intake.mapping import Form, Mapping
from server.intake.parsing import Handed, parse
from server.intake.problems import Fault, Kind, Problem
from server.intake.sheets import load

CONTENT = b"""area,note,f deaths,f people,m deaths,m people
north,x,1,10,2,20

south,y,3,30,4,
"""
FORM = Form(
    across=("sex", "number"),
    across_columns=(
        ("f deaths", "f", "deaths"),
        ("f people", "f", "population"),
        ("m deaths", "m", "deaths"),
        ("m people", "m", "population"),
    ),
)
MAPPING = Mapping(area="area", form=FORM)
KIND = Kind(key="k", severity="error", meaning="", found="", expected="", remedy="")


def test_each_row_becomes_one_for_each_group() -> None:
    sheet = load(layout(CONTENT, "a.csv", FORM), MAPPING, "counts")
    assert sheet.labels["sex"].at(sheet.labels["sex"].codes >= 0).tolist() == ["f", "m"] * 2
    assert sheet.numbers["deaths"].values.tolist() == [1, 2, 3, 4]
    assert sheet.numbers["population"].values.tolist()[:3] == [10, 20, 30]
    assert sheet.numbers["population"].values[3] != sheet.numbers["population"].values[3]


def problem(row: int, last: int, rows: int, column: str) -> Problem:
    fault = Fault(row=row, last_row=last, rows=rows, column=column)
    return Problem.of(KIND, fault, "a.csv")


@pytest.mark.parametrize(
    ("first", "last", "rows", "column", "told"),
    [
        (1, 1, 1, "deaths", (2, 2, 1, "m deaths")),
        (1, 1, 1, "population", (2, 2, 1, "m people")),
        (0, 3, 4, "deaths", (2, 4, 4, "f deaths … m deaths")),
        (1, 3, 2, "population", (2, 4, 2, "m people")),
        (2, 2, 1, "", (4, 4, 1, "f deaths")),  # of the sex, which has no column of its own
        (0, 3, 4, "area", (2, 4, 2, "area")),  # two rows of the file, each twice
    ],
)
def test_a_problem_is_put_back_where_it_stands(
    first: int, last: int, rows: int, column: str, told: tuple[int, int, int, str]
) -> None:
    wide = spread(FORM)
    assert wide is not None
    at = load(layout(CONTENT, "a.csv", FORM), MAPPING, "counts").row
    found = placed(problem(int(at[first]), int(at[last]), rows, column), {"a.csv": wide})
    assert (found.row, found.last_row, found.rows, found.column) == told


def test_addresses_sort_as_the_file_reads_and_are_no_rows() -> None:
    import numpy as np

    found = addresses(np.array([2, 3_000_000]), 2_000)
    assert (np.diff(found) > 0).all()
    assert found[0] >= WIDE
    plain = problem(3, 3, 1, "deaths")
    assert placed(plain, {}) == plain


@pytest.mark.parametrize(
    ("change", "what"),
    [
        ({"across": ("sex", "county")}, "a matter that cannot stand in headings"),
        ({"across": ("sex", "sex")}, "a matter that cannot stand in headings"),
        ({"across": ("sex",)}, "a heading without a value for each matter"),
        ({"across_columns": ()}, "no heading whose meaning is said"),
        ({"across": ()}, "headings with a meaning"),
        ({"across_columns": FORM.across_columns[:1] * 2}, "two headings that mean the same"),
        (
            {"across_columns": (("f deaths", "f", "births"), *FORM.across_columns[1:])},
            "a number that this kind of file does not hold",
        ),
    ],
)
def test_what_cannot_be_made_long_is_told(change: dict[str, object], what: str) -> None:
    form = replace(FORM, **change)  # type: ignore[arg-type]
    mapping = replace(MAPPING, year="note", form=form)
    parsed = parse([Handed("counts", "a.csv", CONTENT, mapping)])
    told = [str(one.values["what"]) for one in parsed.errors if one.key == "bad_across"]
    assert told
    assert told[0].startswith(what)


@pytest.mark.parametrize(
    ("change", "what"),
    [
        ({"sex": "note"}, "a matter that stands in headings and elsewhere too"),
        ({"only_sex": "f"}, "a matter that stands in headings and elsewhere too"),
        ({"deaths": "note"}, "a number in one column beside headings that part it"),
    ],
)
def test_what_stands_in_headings_stands_nowhere_else(change: dict[str, str], what: str) -> None:
    parsed = parse([Handed("counts", "a.csv", CONTENT, replace(MAPPING, **change))])  # type: ignore[arg-type]
    told = [str(one.values["what"]) for one in parsed.errors if one.key == "bad_across"]
    assert what in told
