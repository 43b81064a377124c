"""The addresses of changes and accounts: spelled in full, pinned, with their twins."""

import pytest
from starlette.testclient import TestClient

from server.store.connect import Session
from tests.factories import edition
from tests.server.routes.conftest import counted

CHANGES = "/c/isle/2/changes?since=1&figures=released&settings=almanac-1"
ACCOUNT = (
    "/c/isle/2/account?of=e0&at=north.f.2013&since=1&figures=released&settings=almanac-1"
    "&settings_then=almanac-1"
)


@pytest.fixture(autouse=True)
def second(writer: Session) -> None:
    edition(writer, {"north.f.2013": counted("f", 7, 2.5e-5)})


@pytest.mark.parametrize(
    ("short", "whole"),
    [
        ("/c/isle/changes", CHANGES),
        ("/c/isle/2/changes?settings=almanac-1", CHANGES),
        ("/c/isle/account?at=north.f.2013", ACCOUNT),
        ("/c/isle/2/account?at_area=north&at_sex=f&at_period=2013&of=e0", ACCOUNT),
        (
            "/c/isle/1/account?at=north.f.2013&settings=almanac-2",
            "/c/isle/1/account?of=e0&at=north.f.2013&since=1&figures=released"
            "&settings=almanac-2&settings_then=almanac-2",
        ),
    ],
)
def test_other_spellings_are_sent_to_the_pinned_one(
    reader: TestClient, short: str, whole: str
) -> None:
    answer = reader.get(short)
    assert (answer.status_code, answer.headers["location"]) == (302, whole)


@pytest.mark.parametrize("place", [CHANGES, ACCOUNT])
def test_pages_twins_and_tags(reader: TestClient, place: str) -> None:
    page = reader.get(place)
    assert page.status_code == 200
    view, _, query = place.partition("?")
    told = reader.get(f"{view}.json?{query}").json()
    assert told["address"] == place
    for key in told["figures"]:
        csv = reader.get(f"{view}.csv?{query}&table={key}")
        assert csv.status_code == 200
        assert len(csv.text.splitlines()) == 1 + len(told["figures"][key]["rows"]) + (
            "total" in told["figures"][key]
        )
    assert reader.get(f"{view}.xlsx?{query}").status_code == 200
    again = reader.get(place, headers={"If-None-Match": page.headers["etag"]})
    assert again.status_code == 304
    assert reader.head(place).status_code == 200


@pytest.mark.parametrize(
    ("place", "status"),
    [
        ("/c/isle/1/changes", 404),
        ("/c/isle/2/changes?since=2", 400),
        ("/c/isle/2/changes?since=9", 404),
        ("/c/isle/2/changes?since=x", 400),
        ("/c/isle/2/changes?colour=red", 400),
        ("/c/isle/2/account", 400),
        ("/c/isle/2/account?at=atlantis.f.2013&since=1", 404),
        ("/c/isle/2/account?at=north.f.2013&printed=much", 400),
        ("/c/isle/2/account?at=north.f.2013&settings_then=almanac-0", 400),
    ],
)
def test_what_cannot_be_asked(reader: TestClient, place: str, status: int) -> None:
    answer = reader.get(place, follow_redirects=True)
    assert answer.status_code == status, answer.text[:300]


@pytest.mark.parametrize("place", [CHANGES, ACCOUNT])
def test_a_later_edition_moves_nothing(reader: TestClient, writer: Session, place: str) -> None:
    view, _, query = place.partition("?")
    before = reader.get(f"{view}.json?{query}").content.split(b',"figures":')[1]
    edition(writer, {"north.f.2013": counted("f", 9, 3.5e-5)})
    assert reader.get(f"{view}.json?{query}").content.split(b',"figures":')[1] == before
