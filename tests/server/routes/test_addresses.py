"""Odd spellings of an address lead to the pinned one at once, or are refused in words; tags tell
what stands at one address from what stood there before."""

import datetime as dt
import shutil
from pathlib import Path

import pytest
from starlette.testclient import TestClient

from server.app import create_app
from server.config import Config
from server.store import collections
from server.store.connect import make_engine, sessions, transaction
from tests.factories import NOON, edition, gompertz_panel
from tests.server.web.site import browser

LATER = NOON + dt.timedelta(microseconds=1)
REST = "&figures=released&settings=almanac-1"
TREND = "/c/isle/1/trend.csv?of=e0&area=north&sex=f&sex=m&from=2012&to=2014" + REST
PLACES = (
    "/collections",
    "/c/isle/editions.json",
    "/c/isle/1/contents?figures=released&settings=almanac-1",
    "/c/isle/1/population-year.json?of=north.f.2014" + REST,
)


@pytest.mark.parametrize(
    "table", ["a%20b", "a+b", "a%26b=c", "%C3%BC", "x%0d%0aSet-Cookie:a", "%25", "%23", "%00"]
)
def test_no_spelling_of_a_table_is_redirected_for_ever(reader: TestClient, table: str) -> None:
    answer = reader.get(f"{TREND}&table={table}")
    if answer.status_code == 302:
        assert "set-cookie" not in answer.headers
        answer = reader.get(answer.headers["location"])
    assert answer.status_code == 400
    assert answer.json()["detail"].endswith("”; it has years, estimates.")


@pytest.mark.parametrize(
    ("address", "key"),
    [
        ("/c/isle/trend?from=٢٠١٢", "from"),
        ("/c/isle/trend?to=２０１４", "to"),
        ("/c/isle/population-year?of=north.f.٢٠١٤", "٢٠١٤"),
        ("/c/isle/trend?of=e٦٥", "of"),
        ("/c/isle/trend?of=e065", "of"),
    ],
)
def test_digits_are_those_of_addresses(reader: TestClient, address: str, key: str) -> None:
    answer = reader.get(address)
    assert answer.status_code == 400
    assert key in answer.text


def test_another_database_with_the_same_counts_is_not_taken_for_this_one(
    sqlite_template: Path, tmp_path: Path
) -> None:
    """A browser may hold pages of a database that stood at the same host and port before."""
    tags = []
    for name, opened in (("Isle", NOON), ("Isle, all deaths", NOON), ("Isle", LATER)):
        url = f"sqlite:///{shutil.copy(sqlite_template, tmp_path / f'{len(tags)}.db')}"
        engine = make_engine(url)
        with sessions(engine)() as session:
            with transaction(session):
                collections.create(session, code="isle", name=name, owner="Desk", at=opened)
            edition(session, {"north.f.2014": gompertz_panel()})
        engine.dispose()
        with browser(create_app(Config(database_url=url))) as reader:
            tags.append([reader.head(place).headers["etag"] for place in PLACES])
    for of_one_place in zip(*tags, strict=True):
        assert len(set(of_one_place)) == 3


@pytest.mark.parametrize("place", ["/collections.csv", "/methods.csv", "/c/isle/editions.csv"])
def test_a_key_may_stand_once(reader: TestClient, place: str) -> None:
    answer = reader.get(f"{place}?table=checks&table=settings")
    assert answer.status_code == 400
    assert "“table” 2 times; it may stand once." in answer.json()["detail"]


@pytest.mark.parametrize(
    "view", ["contents", "trend", "population-year", "comparison", "editions", "1/contents"]
)
def test_twins_no_page_has_are_refused_in_words(reader: TestClient, view: str) -> None:
    for suffix in ("pdf", "html", "json?a"):
        answer = reader.get(f"/c/isle/{view}.{suffix.replace('?', '%3F')}")
        assert answer.status_code == 404
        assert f"There is no .{suffix} of this page; there are .csv" in answer.text


@pytest.mark.parametrize("view", ["contents", "trend"])
def test_a_twin_without_an_edition_leads_to_that_of_the_newest(
    reader: TestClient, view: str
) -> None:
    place = reader.get(f"/c/isle/{view}.json").headers["location"]
    assert place.startswith(f"/c/isle/1/{view}.json?")
    assert reader.get(place).status_code == 200


def test_what_a_trend_leaves_open_begins_with_the_whole(sqlite_url: str) -> None:
    engine = make_engine(sqlite_url)
    with sessions(engine)() as session:
        panels = {f"{area}.f.2014": gompertz_panel() for area in ("north", "south")}
        edition(session, panels, parents=dict.fromkeys(("north", "south"), "whole"))
    engine.dispose()
    with browser(create_app(Config(database_url=sqlite_url))) as reader:
        pinned = reader.get("/c/isle/trend").headers["location"]
    assert pinned == "/c/isle/1/trend?of=e0&area=whole&sex=f&from=2014&to=2014" + REST
