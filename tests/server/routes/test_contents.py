"""Collections, editions and contents, as a reader meets them; withdrawing and reinstating."""

import orjson
import pytest
from starlette.testclient import TestClient

from server.store.connect import Session
from tests.factories import edition
from tests.server.routes.conftest import counted

QUERY = "?figures=released&settings=almanac-1"
PAGE = f"/c/isle/1/contents{QUERY}"


@pytest.mark.parametrize("address", ["/c/isle", "/c/isle/contents", "/c/isle/1/contents"])
def test_other_spellings_lead_to_the_pinned_one(reader: TestClient, address: str) -> None:
    answer = reader.get(address)
    assert (answer.status_code, answer.headers["location"]) == (302, PAGE)


def test_the_contents_page_leads_to_every_view(reader: TestClient) -> None:
    text = reader.get(PAGE).text
    assert "The isle, edition 1: 3 years, 2012 to 2014, 3 areas." in text
    asked = "&amp;figures=released&amp;settings=almanac-1"
    assert f"/c/isle/1/population-year?of=cape.f.2014{asked}" in text
    assert f"/c/isle/1/comparison?this=cape.f.2014&amp;that=cape.f.2012&amp;of=e0{asked}" in text
    assert "/c/isle/1/trend?of=e0&amp;area=cape&amp;sex=f&amp;sex=m&amp;from=2012" in text


def test_the_form_makes_the_address_of_a_comparison(reader: TestClient) -> None:
    fields = {
        "this_area": "north",
        "this_sex": "f",
        "this_period": "2014",
        "that_area": "north",
        "that_sex": "m",
        "that_period": "2012",
    }
    assert all(f'name="{name}"' in reader.get(PAGE).text for name in fields)
    answer = reader.get("/c/isle/1/comparison", params=fields)
    assert answer.status_code == 302
    assert reader.get(answer.headers["location"]).status_code == 200


def test_figures_stay_when_a_newer_edition_is_made_and_withdrawn(
    reader: TestClient, writer: Session
) -> None:
    def figures() -> bytes:
        return orjson.dumps(reader.get(f"/c/isle/1/contents.json{QUERY}").json()["figures"])

    before, tag = figures(), reader.get(PAGE).headers["etag"]
    edition(writer, {"north.f.2014": counted("f", 9)}, note="corrected")
    text = reader.get(PAGE).text
    assert "This page shows edition 1 and will go on showing it." in text
    assert reader.get(PAGE).headers["etag"] != tag
    assert figures() == before
    answer = reader.post("/c/isle/2/withdraw", data={"note": "Sent twice."})
    assert (answer.status_code, answer.headers["location"]) == (303, "/c/isle/2/contents")
    assert "Sent twice." in reader.get(f"/c/isle/2/contents{QUERY}").text
    assert "will go on showing it" not in reader.get(PAGE).text
    assert figures() == before


def test_an_edition_is_withdrawn_with_a_reason_and_reinstated(reader: TestClient) -> None:
    answer = reader.post("/c/isle/1/withdraw", data={"note": " "})
    assert answer.status_code == 409
    assert "cannot be withdrawn without a note" in answer.text
    assert reader.get("/c/isle").status_code == 302  # it still stands
    assert reader.post("/c/isle/1/withdraw", data={"note": "Wrong year."}).status_code == 303
    answer = reader.get("/c/isle")
    assert (answer.status_code, answer.headers["location"]) == (302, "/c/isle/editions")
    assert "The isle has no edition that stands" in reader.get("/c/isle/trend").text
    assert "No edition of it stands." in reader.get("/collections").text
    assert "one edition, and it was withdrawn" in reader.get("/c/isle/editions").text
    assert reader.post("/c/isle/1/reinstate", data={"note": "It was right."}).status_code == 303
    assert reader.get("/c/isle").status_code == 302


def test_lists_and_their_twins_agree(reader: TestClient) -> None:
    text = reader.get("/collections").text
    assert "One collection can be read." in text
    assert "In 2014 life expectancy at birth in Cape was" in text
    (row,) = reader.get("/collections.json").json()["figures"]["collections"]["rows"]
    assert (row["code"], row["edition"], row["areas"]) == ("isle", 1, 3)
    csv = reader.get("/c/isle/editions.csv?table=editions").text.splitlines()
    assert csv[0] == "edition,made,by,note,did,standing"
    assert csv[1].startswith("1,")
    assert csv[1].endswith(",stands")


@pytest.mark.parametrize(
    ("address", "status", "words"),
    [
        ("/c/reef", 404, "There is no collection reef; known: isle."),
        ("/c/reef/editions", 404, "There is no collection reef; known: isle."),
        ("/c/isle/4/contents", 404, "There is no edition 4; known: 1."),
        (PAGE + "&of=e0", 400, "key “of”"),
        ("/c/isle/1/contents?settings=best", 400, "can be almanac-1"),
        ("/collections?x=1", 400, "this page takes none"),
        ("/collections.csv?x=1", 400, "It knows table."),
        ("/c/isle/editions.doc", 404, ".csv, .xlsx and .json"),
        ("/c/no%20code", 404, "is no code of a collection"),
    ],
)
def test_what_cannot_be_answered_says_why(
    reader: TestClient, address: str, status: int, words: str
) -> None:
    answer = reader.get(address)
    assert answer.status_code == status
    assert words in answer.text


def test_a_problem_is_told_to_machines_in_their_form(reader: TestClient) -> None:
    answer = reader.get("/c/reef/editions.json")
    assert answer.headers["content-type"] == "application/problem+json"
    assert answer.json()["detail"] == "There is no collection reef; known: isle."
