"""The walk of an analyst by plain forms: from a real country's counts to a comparison."""

import csv
import hashlib
import io
from pathlib import Path

import pytest
from httpx2 import Response
from starlette.testclient import TestClient

from server.app import create_app
from server.config import Config
from tests.factories import counts_csv
from tests.server.web.site import browser

DENMARK = Path(__file__).parents[2] / "published" / "denmark_deaths_personyears_1974_2012.csv"
NEW = {"collection": "", "code": "dk", "name": "All deaths, Denmark", "owner": "The office"}
BASIS = {
    "people": "residents",
    "dated_by": "death",
    "population_is": "person_years",
    "population_date": "each year",
    "source": "civil register",
}
COLUMNS = {
    "counts.year": "year",
    "counts.sex": "sex",
    "counts.age": "age",
    "counts.deaths": "deaths",
    "counts.population": "person_years",
}
DANISH = COLUMNS | BASIS | {"only_area": "dk", "only_area_name": "Denmark", "last_age_open": "yes"}
AREAS = BASIS | {
    f"counts.{field}": field for field in ("year", "sex", "age", "area", "deaths", "population")
}


def sent(client: TestClient, content: bytes, **fields: str) -> Response:
    """Files for a new collection, or the one named in `fields`."""
    return client.post(
        "/uploads", data=NEW | fields, files={"counts": ("counts.csv", content, "text/csv")}
    )


def draft(client: TestClient, content: bytes, **fields: str) -> str:
    """The address of the draft that was made of the files."""
    answer = sent(client, content, **fields)
    assert answer.status_code == 303, answer.text
    return answer.headers["location"].removesuffix("/reading")


def committed(client: TestClient, content: bytes, **fields: str) -> str:
    """The address that a sound upload leads to."""
    place = draft(client, content, **fields)
    assert client.post(f"{place}/reading", data=AREAS).status_code == 303
    answer = client.post(f"{place}/commit", data={"note": "as handed in"})
    assert answer.status_code == 303, answer.text
    return answer.headers["location"]


def contents(client: TestClient, collection: str) -> str:
    """What the newest standing edition says of itself."""
    return client.get(client.get(f"/c/{collection}").headers["location"]).text


def test_the_whole_walk_from_a_file_to_a_comparison(blank: TestClient) -> None:
    content = DENMARK.read_bytes()
    place = draft(blank, content)

    reading = blank.get(f"{place}/reading").text
    assert "7,800 rows" in reading
    assert "34382.8333333333" in reading  # a first row, as it stands in the file
    assert '<option value="person_years" selected>' in reading
    assert "a rate: rates are worked out from the counts" in reading
    assert "sure: its heading says so" in reading

    answer = blank.post(f"{place}/reading", data=DANISH)
    assert (answer.status_code, answer.headers["location"]) == (303, f"{place}/problems")
    problems = blank.get(f"{place}/problems").text
    assert "counts.csv can become an edition, but one thing should be looked at again." in problems
    assert "39, 1974 to 2012" in problems
    assert "0, 1, 2 ... 99+ (100 groups)" in problems

    answer = blank.post(f"{place}/commit", data={"note": "1974 to 2012"})
    assert answer.headers["location"] == "/c/dk/1/contents"
    said = contents(blank, "dk")
    assert "All deaths, Denmark, edition 1: 39 years, 1974 to 2012, one area." in said
    assert "82.0\N{NO-BREAK SPACE}years for women and 78.1\N{NO-BREAK SPACE}years for men" in said
    comparison = blank.get("/c/dk/1/comparison?this=dk.f.2012&that=dk.f.1974")
    assert blank.get(comparison.headers["location"]).status_code == 200

    kept = blank.get(place).text
    assert hashlib.sha256(content).hexdigest() in kept
    assert "edition 1" in kept
    assert "counts.csv became" in blank.get(f"{place}/problems").text


def test_what_is_wrong_is_told_row_by_row_and_nothing_becomes_of_it(blank: TestClient) -> None:
    lines = DENMARK.read_text(encoding="utf-8").splitlines()
    year, sex, age, _deaths, *rest = lines[211].split(",")
    lines[211] = ",".join((year, sex, age, "-3", *rest))
    place = draft(blank, "\n".join(lines).encode())
    blank.post(f"{place}/reading", data=DANISH)
    page = blank.get(f"{place}/problems").text
    assert "counts.csv cannot become an edition yet: one thing must be put right, and" in page
    assert "Must be put right" in page
    assert '<button type="submit" disabled>Make edition 1</button>' in page
    assert "once nothing stands under “Must be put right”" in page
    row = next(csv.DictReader(io.StringIO(blank.get(f"{place}/problems.csv").text)))
    assert (row["file"], row["row"], row["column"]) == ("counts.csv", "212", "deaths")
    assert "-3" in row["found"]
    assert blank.get(f"{place}/problems.json").json()["figures"]["problems"]["rows"]
    answer = blank.post(f"{place}/commit", data={"note": "all the same"})
    assert answer.status_code == 409
    assert "has 1 errors and cannot become an edition" in answer.text
    assert "has no edition yet" in blank.get("/c/dk/editions").text

    corrected = {"file": ("better.csv", DENMARK.read_bytes(), "text/csv")}
    answer = blank.post(f"{place}/files", data={"role": "counts"}, files=corrected)
    better = answer.headers["location"]
    assert "better.csv can become an edition" in blank.get(better).text
    assert blank.get(place).status_code == 404  # the faulty draft is gone


def test_warnings_ask_for_a_note(blank: TestClient) -> None:
    content = counts_csv().replace(b"9007", b"0", 1)
    place = draft(blank, content, code="salt")
    blank.post(f"{place}/reading", data=AREAS)
    page = blank.get(f"{place}/problems").text
    assert "Wants a second look" in page
    assert "Must be put right" not in page
    assert blank.post(f"{place}/commit", data={"note": ""}).status_code == 409
    answer = blank.post(f"{place}/commit", data={"note": "Nobody lived there."})
    assert answer.headers["location"] == "/c/salt/1/contents"


def test_a_second_upload_takes_over_reading_and_basis(blank: TestClient) -> None:
    committed(blank, counts_csv(), code="salt")
    place = draft(blank, counts_csv(years=(2003,)), collection="salt")
    reading = blank.get(f"{place}/reading").text
    assert 'value="civil register"' in reading
    assert 'value="residents" checked' in reading
    blank.post(f"{place}/reading", data=AREAS | {"provisional": "2003"})
    page = blank.get(f"{place}/problems").text
    assert "Nothing has changed: edition 1 stands." in page
    assert "Make edition 2" in page
    blank.post(f"{place}/commit", data={"note": "2003 added"})
    assert (
        "3 years, 2001 to 2003"
        in blank.get("/c/salt/2/contents?figures=released&settings=almanac-1").text
    )


def test_an_upload_may_replace_all_that_stood(blank: TestClient) -> None:
    committed(blank, counts_csv(), code="salt")
    place = draft(blank, counts_csv(years=(2003,)), collection="salt")
    blank.post(f"{place}/reading", data=AREAS)
    blank.post(
        f"{place}/commit", data={"note": "2003", "gives_way": "all", "shown": "gives_way=all"}
    )
    assert "the one year 2003" in contents(blank, "salt")


def test_checks_that_ran_against_another_edition_are_run_again(blank: TestClient) -> None:
    place = draft(blank, counts_csv(years=(2003,)), code="salt")
    blank.post(f"{place}/reading", data=AREAS)
    committed(blank, counts_csv(), collection="salt")
    assert "The checks ran when no edition stood; now edition 1 stands." in (
        blank.get(f"{place}/problems").text
    )
    assert blank.post(f"{place}/commit", data={"note": "late"}).status_code == 409
    assert blank.post(f"{place}/check").headers["location"] == f"{place}/problems"
    assert blank.post(f"{place}/commit", data={"note": "late"}).status_code == 303


def test_drafts_are_listed_and_can_be_thrown_away(blank: TestClient) -> None:
    assert "No draft waits" in blank.get("/uploads").text
    place = draft(blank, counts_csv())
    assert "One draft waits to become an edition." in blank.get("/uploads").text
    assert blank.get(f"{place}/problems").headers["location"] == f"{place}/reading"
    assert blank.post(f"{place}/discard").headers["location"] == "/uploads"
    assert "No draft waits" in blank.get("/uploads").text
    assert blank.get(place).status_code == 404


def test_an_edition_is_no_longer_a_draft(blank: TestClient) -> None:
    committed(blank, counts_csv(), code="salt")
    assert "Uploads that became editions" in blank.get("/uploads").text
    for step in ("reading", "discard", "check"):
        answer = blank.post(f"/uploads/1/{step}", data=AREAS)
        assert answer.status_code == 409, step
    assert blank.get("/uploads/1/reading").status_code == 409
    assert 'action="/uploads/1/discard"' not in blank.get("/uploads/1").text


@pytest.mark.parametrize(
    ("fields", "status", "words"),
    [
        ({"collection": "reef"}, 404, "There is no collection reef"),
        ({"code": "two words"}, 409, "expected 1 to 32 of the letters"),
        ({"name": ""}, 409, "needs a name and an owner"),
    ],
)
def test_a_collection_that_cannot_be_is_refused(
    blank: TestClient, fields: dict[str, str], status: int, words: str
) -> None:
    answer = sent(blank, counts_csv(), **fields)
    assert answer.status_code == status
    assert words in answer.text
    assert "No draft waits" in blank.get("/uploads").text


def test_no_file_is_told_and_nothing_is_opened(blank: TestClient) -> None:
    unchosen = {"counts": ("", b"", "application/octet-stream")}  # as browsers send it
    answer = blank.post("/uploads", data=NEW, files=unchosen)
    assert answer.status_code == 422
    assert "No file was chosen. Go back and choose" in answer.text
    assert blank.get("/").status_code == 200  # no collection was opened
    place = draft(blank, counts_csv())
    answer = blank.post(
        f"{place}/files", data={"role": "counts"}, files={"file": unchosen["counts"]}
    )
    assert answer.status_code == 422
    assert "choose the corrected file" in answer.text


def test_a_file_that_is_too_large_is_refused(sqlite_url: str) -> None:
    small = Config(database_url=sqlite_url, upload_limit=1_000_000)
    with browser(create_app(small)) as client:
        answer = sent(client, b"year,age\n" * 200_000)
        assert answer.status_code == 413
        assert "larger than 1 MB" in answer.text
        assert client.get("/healthz").status_code == 200
        assert client.get("/").status_code == 200


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"people": "", "source": ""}, "To be answered: whose deaths are counted."),
        ({"dated_by": "burial"}, "To be answered: what decides the year of a death."),
        ({"provisional": "2001, last year"}, "hold “last year”"),
    ],
)
def test_answers_that_are_missing_are_named(
    blank: TestClient, changes: dict[str, str], words: str
) -> None:
    place = draft(blank, counts_csv())
    answer = blank.post(f"{place}/reading", data=AREAS | changes)
    assert answer.status_code == 422
    assert words in answer.text
    assert blank.get(f"{place}/problems").status_code == 302  # not mapped, not checked


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"", "found an empty file"),
        (b"PK\x03\x04 not a text", "spreadsheet"),
        (b"year,sex\n", "row"),
    ],
)
def test_a_file_that_cannot_be_read_says_so_at_once(
    blank: TestClient, content: bytes, words: str
) -> None:
    place = draft(blank, content)
    page = blank.get(f"{place}/reading")
    assert page.status_code == 200
    assert 'class="rubric"' in page.text
    assert words in page.text


def test_a_form_sent_by_a_program_gets_its_problem_as_json(blank: TestClient) -> None:
    answer = blank.post("/uploads", data=NEW, headers={"Accept": "application/json"})
    assert answer.headers["content-type"] == "application/problem+json"
    assert answer.json()["status"] == 422
    assert answer.json()["detail"].startswith("No file was chosen.")


@pytest.mark.parametrize(
    ("address", "status", "words"),
    [
        ("/uploads/7", 404, "There is no upload 7"),
        ("/uploads/7/problems", 404, "There is no upload 7"),
        ("/uploads?x=1", 400, "this page takes none"),
        ("/uploads/new?collection=reef", 404, "There is no collection reef"),
        ("/uploads/new?code=x", 400, "It knows collection."),
    ],
)
def test_what_cannot_be_answered_says_why(
    blank: TestClient, address: str, status: int, words: str
) -> None:
    answer = blank.get(address)
    assert answer.status_code == status
    assert words in answer.text


def test_a_text_that_no_database_keeps_is_refused(blank: TestClient) -> None:
    answer = sent(blank, counts_csv(times=40), name="All\0deaths")
    assert answer.status_code == 422
    assert "The text of “name” holds a character that is none." in answer.text
    place = draft(blank, counts_csv(times=40))
    assert blank.post(f"{place}/reading", data=AREAS | {"source": "\0"}).status_code == 422
    assert blank.post(f"{place}/reading", data=AREAS).status_code == 303
    assert blank.post(f"{place}/commit", data={"note": "\0"}).status_code == 422
    assert blank.post(f"{place}/commit", data={"note": "x"}).status_code == 303
    assert blank.post("/c/dk/1/withdraw", data={"note": "\0"}).status_code == 422


def test_the_list_of_problems_is_sent_again_once_another_edition_stands(blank: TestClient) -> None:
    committed(blank, counts_csv(times=40))
    places = [draft(blank, counts_csv(times=41), collection="dk") for _ in range(2)]
    for place in places:
        assert blank.post(f"{place}/reading", data=AREAS).status_code == 303
    listed = blank.get(f"{places[1]}/problems.json")
    assert listed.json()["notices"] == []
    assert blank.post(f"{places[0]}/commit", data={"note": "x"}).status_code == 303
    again = blank.get(
        f"{places[1]}/problems.json", headers={"If-None-Match": listed.headers["etag"]}
    )
    assert again.status_code == 200
    assert [told["word"] for told in again.json()["notices"]] == ["Check again"]
