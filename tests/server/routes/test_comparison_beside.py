"""Comparisons with another edition or collection: one spelling, one tag for all they rest on."""

from collections.abc import Callable
from contextlib import AbstractContextManager

import pytest
from starlette.testclient import TestClient

from server.accounts.viewer import LOCAL
from server.actions.set_policy import set_policy
from server.store.connect import Session
from server.store.records import Terms
from tests.factories import NOON, edition, withdrawn
from tests.server.routes.conftest import counted

CHOICES = "of=e0&figures=released&settings=almanac-1"
SAME = "this=north.f.2014&that=north.f.2014"
COAST = f"/c/isle/1/comparison?{SAME}&that_collection=coast&that_edition=1&{CHOICES}"
REVISION = f"/c/isle/2/comparison?{SAME}&that_edition=1&{CHOICES}"
STANDARD = f"/c/isle/1/comparison?this=north.f.2014&standard=gbd2010&{CHOICES}"


@pytest.fixture
def two(writer: Session) -> Session:
    """Edition 2 of the isle revises one woman's year; the coast has the same code."""
    edition(writer, {"north.f.2014": counted("f", 9)})
    edition(writer, {"north.f.2014": counted("f", 4)}, code="coast")
    return writer


@pytest.mark.parametrize(
    ("asked", "place"),
    [
        (f"/c/isle/1/comparison?{SAME}&that_collection=coast", COAST),
        (f"/c/isle/comparison?{SAME}&that_edition=1", REVISION),
        ("/c/isle/1/comparison?this=north.f.2014&standard=gbd2010&that_area=rock", STANDARD),
    ],
)
def test_other_spellings_go_to_the_one(
    two: Session, reader: TestClient, asked: str, place: str
) -> None:
    answer = reader.get(asked, follow_redirects=False)
    assert (answer.status_code, answer.headers["location"]) == (302, place)
    assert reader.get(place, follow_redirects=False).status_code == 200


@pytest.mark.parametrize("place", [COAST, REVISION])
def test_a_known_page_is_known_by_two_statements(
    two: Session,
    reader: TestClient,
    count_statements: Callable[[], AbstractContextManager[list[str]]],
    place: str,
) -> None:
    tag = reader.get(place).headers["etag"]
    with count_statements() as statements:
        again = reader.get(place, headers={"If-None-Match": tag})
    assert again.status_code == 304
    assert len(statements) == 2  # both headings


def test_what_befalls_the_other_collection_makes_another_page(
    two: Session, reader: TestClient
) -> None:
    seen = [reader.get(COAST)]
    edition(two, {"north.f.2014": counted("f", 5)}, code="coast")
    seen.append(reader.get(COAST))
    set_policy(two, collection="coast", terms=Terms(5), note="Small counts.", by=LOCAL, now=NOON)
    seen.append(reader.get(COAST))
    withdrawn(two, 1, "coast")
    seen.append(reader.get(COAST))
    assert [one.status_code for one in seen] == [200] * 4
    assert len({one.headers["etag"] for one in seen}) == 4
    assert "The other side stands in edition 1" not in seen[0].text
    assert "The other side stands in edition 1" in seen[1].text
    assert "in which the other side stands, was withdrawn" in seen[3].text


def test_the_policy_of_the_other_collection_is_kept(two: Session, reader: TestClient) -> None:
    """Its small counts are withheld here as there, in every twin."""
    text = reader.get(COAST.replace("comparison?", "comparison.json?")).json()
    set_policy(two, collection="coast", terms=Terms(100), note="Small counts.", by=LOCAL, now=NOON)
    after = reader.get(COAST.replace("comparison?", "comparison.json?")).json()
    assert text["figures"] != after["figures"]
    page = reader.get(COAST).text
    assert "Withheld" in page
    full = reader.get(COAST.replace("released", "full"))
    assert "Withheld" not in full.text


def test_an_earlier_edition_withdrawn_is_told_beside_the_revision(
    two: Session, reader: TestClient
) -> None:
    before = reader.get(REVISION)
    withdrawn(two, 1, "isle")
    after = reader.get(REVISION)
    assert before.headers["etag"] != after.headers["etag"]
    assert "was withdrawn on" in after.text
    assert "It is a revision" in after.text


def test_a_page_without_another_edition_does_not_mind_other_collections(
    two: Session, reader: TestClient
) -> None:
    before = reader.get(STANDARD).headers["etag"]
    edition(two, {"north.f.2014": counted("f", 5)}, code="coast")
    assert reader.get(STANDARD).headers["etag"] == before


def test_an_unknown_edition_is_told_with_those_there_are(two: Session, reader: TestClient) -> None:
    answer = reader.get(REVISION.replace("that_edition=1", "that_edition=7"))
    assert answer.status_code == 404
    assert "1" in answer.text
