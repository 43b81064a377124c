"""Problems: a page for people, JSON for programs, a notice beside what stays."""

import pytest
from starlette.testclient import TestClient

SENTENCE = "There is no edition 7; known: 1, 3."
SAME = {"Sec-Fetch-Site": "same-origin"}


def test_a_person_gets_a_page_in_the_anatomy_of_every_page(reader: TestClient) -> None:
    answer = reader.get("/missing?of=e0")
    assert answer.status_code == 404
    assert answer.headers["content-type"] == "text/html; charset=utf-8"
    assert answer.headers["cache-control"] == "private, no-store"
    assert f'<h1 class="answer">{SENTENCE}</h1>' in answer.text
    assert '<p class="sidehead">No such page</p>' in answer.text
    assert "/missing?of=e0" in answer.text
    assert f"Problem 404, request {answer.headers['x-request-id']}." in answer.text


@pytest.mark.parametrize("form", [".json", ".csv", ".xlsx"])
def test_a_program_gets_problem_json(reader: TestClient, form: str) -> None:
    answer = reader.get(f"/missing{form}?of=e0")
    assert answer.status_code == 404
    assert answer.headers["content-type"] == "application/problem+json"
    assert answer.json() == {
        "type": "about:blank",
        "title": "No such page",
        "status": 404,
        "detail": SENTENCE,
        "instance": f"/missing{form}?of=e0",
        "request": answer.headers["x-request-id"],
        "errors": [],
    }


def test_an_address_is_told_as_it_may_stand_in_a_link(reader: TestClient) -> None:
    place = "/nothing%20%C3%BC%3F%25/%22.json?of=%3Ce0%3E"
    assert reader.get(place).json()["instance"] == place


def test_htmx_gets_a_notice_and_the_page_stays(reader: TestClient) -> None:
    answer = reader.get("/missing", headers={"HX-Request-Type": "partial", "HX-Target": "div#x"})
    assert answer.status_code == 404
    assert answer.headers["hx-retarget"] == "#notices"
    assert answer.headers["hx-push-url"] == "false"  # the address bar keeps what is seen
    assert answer.text.startswith('<div class="notice" role="alert">')
    assert SENTENCE in answer.text
    assert "<html" not in answer.text


def test_an_address_without_route_is_told_the_same_way(reader: TestClient) -> None:
    answer = reader.get("/nothing/here")
    assert answer.status_code == 404
    assert "There is nothing at this address." in answer.text
    assert reader.get("/nothing.json").json()["title"] == "No such page"


def test_a_method_that_an_address_does_not_take(reader: TestClient) -> None:
    answer = reader.post("/small", headers=SAME)
    assert answer.status_code == 405
    assert sorted(answer.headers["allow"].split(", ")) == ["GET", "HEAD"]
    assert "This address does not take what was sent to it." in answer.text


def test_each_part_that_cannot_be_read_is_named(reader: TestClient) -> None:
    answer = reader.get("/counted/many.json")
    assert answer.status_code == 422
    (error,) = answer.json()["errors"]
    assert error["detail"].startswith("number: Input should be a valid integer")
    assert "number: Input should be" in reader.get("/counted/many").text


def test_a_form_sent_by_a_program_is_answered_in_json(reader: TestClient) -> None:
    asks = SAME | {"Accept": "application/json, text/html"}
    assert reader.post("/small", headers=asks).json()["status"] == 405
    browser = SAME | {"Accept": "text/html, application/json"}
    assert reader.post("/small", headers=browser).text.startswith("<!doctype html>")


def test_what_was_asked_is_escaped(reader: TestClient) -> None:
    assert "<script>alert" not in reader.get("/nothing?<script>alert(1)</script>").text
