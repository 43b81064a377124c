"""The page of quality, its twins, and the form that states it."""

import pytest
from starlette.testclient import TestClient

from server.exports.table import Column, Row, Table
from server.pages.quality_tables import in_parts
from server.sentences import quality as say
from server.sentences.pieces import plain
from server.store.connect import Session
from tests.factories import edition
from tests.server.routes.conftest import counted

QUERY = "?figures=released&settings=almanac-1"
PAGE = f"/c/isle/1/quality{QUERY}"


def test_the_answer_the_picture_and_the_tables_stand_there(reader: TestClient) -> None:
    text = reader.get(PAGE).text
    assert "The isle, edition 1: all 9 areas and years are complete; the checks find" in text
    assert "2014 is provisional and may change." in text
    for part in ("by-year", "findings", "indices", "statement"):
        assert f'id="{part}"' in text
    assert 'href="/checks#' in text


def test_other_spellings_lead_to_the_pinned_one(reader: TestClient) -> None:
    for address in ("/c/isle/quality", "/c/isle/1/quality", "/c/isle/1/quality?figures=released"):
        answer = reader.get(address)
        assert (answer.status_code, answer.headers["location"]) == (302, PAGE)
    assert "/c/isle/1/quality?" in reader.get(f"/c/isle/1/contents{QUERY}").text


def test_twins_hold_the_same_and_no_count(reader: TestClient) -> None:
    told = reader.get(PAGE.replace("quality?", "quality.json?")).json()
    assert {"by_year", "indices", "statement"} <= set(told["tables"])
    table = reader.get(PAGE.replace("quality?", "quality.csv?") + "&table=by_year").text
    assert "y2012" in table
    assert table.count("p") >= 3
    findings = reader.get(PAGE.replace("quality?", "quality.csv?") + "&table=findings").text
    assert "check,times,areas,years,remedy" in findings


def test_what_is_stated_is_shown_and_kept(reader: TestClient, writer: Session) -> None:
    tag = reader.get(PAGE).headers["etag"]
    assert "Nobody has stated anything yet." in reader.get(PAGE).text
    for said in ("Civil registers", "Civil registers <and> hospitals"):
        answer = reader.post("/c/isle/1/quality", data={"source": said, "contact": ""})
        assert (answer.status_code, answer.headers["location"]) == (
            303,
            "/c/isle/1/quality#statement",
        )
    text = reader.get(PAGE).text
    assert "Civil registers &lt;and&gt; hospitals" in text
    assert "in place of 1 before, which are kept." in text
    assert reader.get(PAGE).headers["etag"] != tag
    edition(writer, {"north.f.2014": counted("f", 9)})
    assert "Nobody has stated anything yet." in reader.get(f"/c/isle/2/quality{QUERY}").text
    empty = reader.post("/c/isle/1/quality", data={})
    assert empty.status_code == 409
    assert "Nothing is stated." in empty.text


@pytest.mark.parametrize(
    ("complete", "places", "findings", "said"),
    [
        (0, 0, 0, "X, edition 2, holds nothing to judge."),
        (
            6,
            6,
            0,
            "X, edition 2: all 6 areas and years are complete; the checks find nothing in them",
        ),
        (5, 6, 1, "5 of 6 areas and years are complete; the checks find one thing that wants"),
        (1, 1, 3, "the one area and year is complete; the checks find 3 things that want"),
    ],
)
def test_the_answer_in_words(complete: int, places: int, findings: int, said: str) -> None:
    assert said in plain(say.answer("X", 2, complete, places, findings))


def test_signs_of_an_area_and_year() -> None:
    assert say.mark("complete", False, False, ()) == "·"
    assert say.mark("complete", True, False, ("years",)) == "Yp"
    assert say.mark("part", True, True, ("completeness", "ages")) == "½ACpe"
    assert say.mark("none", False, False, ()) == ""
    assert [sign for sign, _ in say.key_of_marks("·Yp")] == ["·", "Y", "p"]


def test_many_areas_and_years_are_counted() -> None:
    assert say.areas(["a", "b"], 7) == "a, b"
    assert say.areas(["a", "b"], 2) == "all areas"
    assert say.areas([*"abcde"], 7) == "5 areas"
    assert say.areas([], 7) == "all together"
    assert say.years(["2001", "2003"]) == "2001, 2003"
    assert say.years([str(year) for year in range(2001, 2010)]) == "9 of 2001 to 2009"
    assert plain(say.kept("{braces}", 2)).endswith("2 warnings and this note: “{braces}”")


def test_the_picture_of_many_years_is_cut_into_decades(session: Session) -> None:
    """No part is wider than a page, and together they are the whole table."""
    years = [str(year) for year in range(1974, 2013)]
    columns = (Column("area", "area"), *(Column(f"y{y}", y[2:], span=f"{y[:3]}0s") for y in years))
    rows = tuple(Row((area, *(f"{area}{y}" for y in years)), shown=area) for area in "ab")
    whole = Table("by_year", "What is known", columns, rows)
    parts = in_parts(whole)
    assert [len(part.columns) - 1 for part in parts] == [26, 13]
    assert [one for part in parts for one in part.columns[1:]] == list(columns[1:])
    for at, row in enumerate(rows):
        assert [cell for part in parts for cell in part.rows[at].cells[1:]] == list(row.cells[1:])
        assert {part.rows[at].cells[0] for part in parts} == {row.cells[0]}
    assert len({part.key for part in parts}) == len(parts)
    assert in_parts(parts[0]) == (parts[0],)
