"""The form that erases an upload's bytes, and what its pages say afterwards."""

from starlette.testclient import TestClient

from tests.factories import counts_csv
from tests.server.routes.test_uploads import committed, draft


def test_the_upload_and_its_edition_say_that_bytes_were_erased(blank: TestClient) -> None:
    place = committed(blank, counts_csv(), code="salt")
    page = blank.get(place, follow_redirects=True)
    assert "erased" not in page.text
    assert "Erase the bytes" in blank.get("/uploads/1").text
    figures = blank.get("/c/salt/1/contents.json", follow_redirects=True).json()["figures"]
    tag = {"If-None-Match": page.headers["etag"]}
    assert blank.post("/uploads/1/erase", data={"why": " "}).status_code == 409
    answer = blank.post("/uploads/1/erase", data={"why": "Names stood in it"})
    assert (answer.status_code, answer.headers["location"]) == (303, "/uploads/1")
    upload = blank.get("/uploads/1").text
    assert "by local analyst: Names stood in it" in upload
    assert "The bytes are no longer kept." in upload
    assert "Erase the bytes" not in upload
    again = blank.get(place, headers=tag, follow_redirects=True)
    assert again.status_code == 200  # the notice is news
    assert "were erased on" in again.text
    assert "Names stood in it." in again.text
    assert "bytes erased" in blank.get("/c/salt/editions").text
    assert blank.get("/c/salt/1/contents.json", follow_redirects=True).json()["figures"] == figures


def test_a_draft_is_discarded_instead(blank: TestClient) -> None:
    place = draft(blank, counts_csv(), code="salt")
    assert "Erase the bytes" not in blank.get(place).text
    answer = blank.post(f"{place}/erase", data={"why": "names"})
    assert answer.status_code == 409
    assert "is a draft" in answer.text


def test_a_draft_of_personal_data_is_discarded_as_such(blank: TestClient) -> None:
    place = draft(blank, counts_csv(), code="salt")
    assert 'name="personal" value="yes"' in blank.get(place).text
    answer = blank.post(f"{place}/discard", data={"personal": "yes"})
    assert (answer.status_code, answer.headers["location"]) == (303, "/uploads")
    assert blank.get(place).status_code == 404
