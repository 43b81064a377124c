"""Addresses that ask for what there is not: one sentence as a page, as a problem in JSON under the
address of each twin, and on a terminal."""

import pytest
from starlette.testclient import TestClient

from tests.server.bad_input.conftest import CHOICES, EDITION, PROBLEM, Terminal, words

VIEWS = {
    "population-year": f"of=north.f.2001{CHOICES}",
    "comparison": f"this=north.f.2001&that=north.m.2001&of=e0{CHOICES}",
    "trend": f"of=e0&area=north&sex=f&from=2001&to=2002{CHOICES}",
    "contents": CHOICES.removeprefix("&"),
}
each_view = pytest.mark.parametrize("view", VIEWS)


def told(reader: TestClient, view: str, query: str, status: int, sentence: str, at: str) -> None:
    """As a page, and as a problem under the address of each twin."""
    page = reader.get(f"{at}/{view}?{query}")
    assert page.status_code == status
    assert page.headers["content-type"].startswith("text/html")
    assert sentence in words(page)
    for twin in ("json", "csv", "xlsx"):
        problem = reader.get(f"{at}/{view}.{twin}?{query}")
        assert (problem.status_code, problem.headers["content-type"]) == (status, PROBLEM)
        content = problem.json()
        assert content["status"] == status
        assert sentence in content["detail"]
        assert content["instance"].startswith(f"{at}/{view}.{twin}?")


@each_view
def test_an_unknown_key(reader: TestClient, view: str) -> None:
    sentence = "The address has the key “colour”, which this page does not know. It knows "
    told(reader, view, f"{VIEWS[view]}&colour=blue", 400, sentence, EDITION)


@each_view
def test_a_collection_that_is_not_there(reader: TestClient, view: str) -> None:
    sentence = "There is no collection reef; known: saltmarsh."
    told(reader, view, VIEWS[view], 404, sentence, "/c/reef/1")


@each_view
def test_an_edition_that_is_not_there(reader: TestClient, view: str) -> None:
    sentence = "There is no edition 7; known: 1."
    told(reader, view, VIEWS[view], 404, sentence, "/c/saltmarsh/7")


@pytest.mark.parametrize(
    ("view", "old", "new", "sentence"),
    [
        (
            "population-year",
            "2001",
            "1950",
            "This edition does not hold north.f.1950, or not both its deaths and its",
        ),
        ("population-year", "north", "east", "Its areas are north and south;"),
        ("population-year", "north.f.2001", "north", "“north” is not an area, sex and year."),
        (
            "comparison",
            "north.m.2001",
            "north.m.1950",
            "does not hold north.m.1950, or not both its deaths",
        ),
        ("comparison", "of=e0", "of=joy", "The key “of” has the value “joy”; it can be e0, e65,"),
        ("trend", "area=north", "area=east", "This edition has no area east. Its areas are north"),
        (
            "trend",
            "from=2001&to=2002",
            "from=1950&to=1951",
            "from 1950 to 1951. Its years are 2001",
        ),
        ("trend", "sex=f", "sex=girls", "The key “sex” has the value “girls”; it can be f, m, p."),
        ("contents", "almanac-1", "best", "The key “settings” has the value “best”; it can be"),
    ],
)
def test_a_question_the_edition_cannot_answer(
    reader: TestClient, view: str, old: str, new: str, sentence: str
) -> None:
    query = VIEWS[view].replace(old, new, 1)
    status = reader.get(f"{EDITION}/{view}?{query}").status_code
    assert status in (400, 404)
    told(reader, view, query, status, sentence, EDITION)


@pytest.mark.parametrize(
    ("arguments", "sentence"),
    [
        (("e0", "--collection", "reef"), "There is no collection reef; known: saltmarsh."),
        (("e0", "--edition", "7"), "There is no edition 7; known: 1."),
        (("e0", "--area", "east"), "This edition has no area east. Its areas are north and south."),
        (("e0", "--from", "1950", "--to", "1951"), "Its years are 2001 to 2002."),
        (("joy",), "The key “of” has the value “joy”; it can be e0, e65,"),
        (("e0", "--colour", "blue"), "unrecognized arguments: --colour blue"),
        (("e0", "--sex", "girls"), "invalid choice: 'girls' (choose from"),
    ],
)
def test_a_question_that_cannot_be_answered_on_the_terminal(
    ebbline: Terminal, arguments: tuple[str, ...], sentence: str
) -> None:
    collection = () if "--collection" in arguments else ("--collection", "saltmarsh")
    said = ebbline("figure", *arguments, *collection)
    assert (said.code, said.out) == (2, "")
    assert sentence in said.err
    assert len(said.err.strip().split("\n")) == 1 or said.err.startswith("usage: ")


def test_a_draft_that_is_not_there(reader: TestClient) -> None:
    page = reader.get("/uploads/999/problems")
    assert page.status_code == 404
    assert "There is no upload 999" in words(page)
    json = reader.get("/uploads/999/problems.json")
    assert (json.status_code, json.headers["content-type"]) == (404, PROBLEM)
    assert "There is no upload 999" in json.json()["detail"]
