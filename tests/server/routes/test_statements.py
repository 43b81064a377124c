"""How often a page asks the database: as often for a thousand population-years as for two."""

from collections.abc import Callable
from contextlib import AbstractContextManager

import pytest
from fastapi import FastAPI
from starlette.testclient import TestClient

from server.app import create_app
from server.config import Config
from server.store.connect import make_engine, sessions
from tests.factories import edition, gompertz_panel
from tests.server.web.site import browser

AREAS = [f"a{number}" for number in range(10)]
YEARS = [str(year) for year in range(1970, 2020)]
ASKED = "figures=released&settings=almanac-1"
SMALL = f"/c/isle/1/trend?of=e0&area=a0&sex=f&from=2018&to=2019&{ASKED}"
LARGE = (
    "/c/isle/1/trend?of=e0"
    + "".join(f"&area={area}" for area in AREAS)
    + f"&sex=f&sex=m&from=1970&to=2019&{ASKED}"
)
MOST = 8

Counting = Callable[[], AbstractContextManager[list[str]]]


def wide_isle(url: str) -> FastAPI:
    """An application on ten areas, two sexes and fifty years."""
    engine = make_engine(url)
    panels = {
        f"{area}.{sex}.{year}": gompertz_panel(sex=sex, level=3e-5 - 2e-7 * at, people=4e5)
        for area in AREAS
        for sex in "fm"
        for at, year in enumerate(YEARS)
    }
    with sessions(engine)() as session:
        edition(session, panels)
    engine.dispose()
    return create_app(Config(database_url=url))


def asked(reader: TestClient, place: str, counting: Counting) -> int:
    """Statements of one request that is answered."""
    with counting() as statements:
        answer = reader.get(place)
    assert answer.status_code == 200, answer.text[:300]
    return len(statements)


@pytest.mark.parametrize("twin", ["", ".json", ".xlsx"])
def test_a_trend_of_twenty_by_fifty_asks_as_often_as_one_of_one_by_two(
    sqlite_url: str, count_statements: Counting, twin: str
) -> None:
    with browser(wide_isle(sqlite_url)) as reader:
        places = (one.replace("trend?", f"trend{twin}?") for one in (SMALL, LARGE))
        small, large = (asked(reader, place, count_statements) for place in places)
        newer = make_engine(sqlite_url)
        with sessions(newer)() as session:
            edition(session, {"a0.f.2019": gompertz_panel(level=2.5e-5)})
        newer.dispose()
        superseded = [asked(reader, place, count_statements) for place in (SMALL, LARGE)]
    assert small == large <= MOST
    assert superseded[0] == superseded[1] <= MOST


@pytest.mark.parametrize(
    "place",
    [
        f"/c/isle/1/population-year?of=north.f.2014&{ASKED}",
        f"/c/isle/1/population-year?of=north.p.2013&{ASKED}",
        f"/c/isle/1/comparison?this=north.p.2014&that=cape.f.2012&of=e0&{ASKED}",
        f"/c/isle/1/contents?{ASKED}",
        "/collections",
        "/c/isle/editions",
    ],
)
def test_no_page_asks_more_than_eight_times_and_a_known_one_once(
    reader: TestClient, count_statements: Counting, place: str
) -> None:
    assert 0 < asked(reader, place, count_statements) <= MOST
    tag = reader.head(place).headers["etag"]
    with count_statements() as statements:
        assert reader.get(place, headers={"If-None-Match": tag}).status_code == 304
    assert len(statements) == 1
