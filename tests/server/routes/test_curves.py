"""/c/{collection}/{edition}/curves and its twins, as a reader meets them."""

import csv
import io

import orjson
import pytest
from fastapi import FastAPI
from starlette.testclient import TestClient

from server.app import create_app
from server.config import Config
from server.pages import curves as page
from tests.server.web.site import browser

QUERY = "?of=north.f.2014&figures=released&settings=almanac-1"
PAGE = f"/c/isle/1/curves{QUERY}"


def twin(suffix: str, query: str = QUERY) -> str:
    return f"/c/isle/1/curves.{suffix}{query}"


def figures(reader: TestClient, address: str = twin("json")) -> bytes:
    """The bytes under "figures"."""
    answer = reader.get(address)
    assert answer.status_code == 200
    return orjson.dumps(orjson.loads(answer.content)["figures"])


def test_the_page_answers_with_a_sentence(reader: TestClient) -> None:
    answer = reader.get(PAGE)
    assert answer.status_code == 200
    assert "the death rates of women of North in 2014" in answer.text


@pytest.mark.parametrize(
    "spelled",
    [
        "/c/isle/curves?of=north.f.2014",
        "/c/isle/1/curves?of=north.f.2014",
        "/c/isle/01/curves" + QUERY,
        "/c/isle/1/curves?settings=almanac-1&of=north.f.2014&figures=released",
        "/c/isle/1/curves?of_area=north&of_sex=f&of_period=2014",
    ],
)
def test_other_spellings_lead_to_the_pinned_one(reader: TestClient, spelled: str) -> None:
    answer = reader.get(spelled)
    assert (answer.status_code, answer.headers["location"]) == (302, PAGE)


def test_twins_without_an_edition_lead_to_their_own(reader: TestClient) -> None:
    answer = reader.get("/c/isle/curves.json?of=north.f.2014")
    assert answer.headers["location"] == twin("json")
    answer = reader.get(twin("csv"))
    assert answer.headers["location"] == twin("csv", QUERY + "&table=curves")


@pytest.mark.parametrize(
    ("address", "status", "words"),
    [
        (PAGE + "&off=1", 400, "key “off”"),
        (PAGE + "&of=north.m.2014", 400, "“of” 2 times"),
        ("/c/isle/1/curves", 400, "lacks the key “of”"),
        (PAGE.replace("almanac-1", "best"), 400, "can be almanac-1"),
        (PAGE + "&table=life", 400, "key “table”"),
        (twin("csv") + "&table=lives", 400, "no table “lives”"),
        (PAGE.replace("2014", "1950"), 404, "does not hold north.f.1950"),
        (PAGE.replace("north", "east"), 404, "areas are cape, north and rock"),
        (PAGE.replace("/1/", "/7/"), 404, "edition 7"),
        (PAGE.replace("isle", "reef"), 404, "collection reef"),
        (twin("pdf"), 404, ".csv, .xlsx and .json"),
    ],
)
def test_what_cannot_be_answered_says_why(
    reader: TestClient, address: str, status: int, words: str
) -> None:
    answer = reader.get(address)
    assert answer.status_code == status
    json = answer.headers["content-type"] == "application/problem+json"
    assert words in (answer.json()["detail"] if json else answer.text)


def test_head_and_repeats_send_no_body(reader: TestClient, isle: FastAPI) -> None:
    first = reader.get(PAGE)
    head = reader.head(PAGE)
    assert (head.status_code, head.content) == (200, b"")
    assert head.headers["etag"] == first.headers["etag"]
    again = reader.get(PAGE, headers={"If-None-Match": first.headers["etag"]})
    assert (again.status_code, again.content) == (304, b"")


def test_a_repeat_runs_no_engine_code(reader: TestClient, monkeypatch: pytest.MonkeyPatch) -> None:
    first = reader.get(PAGE)
    monkeypatch.delattr(page, "curves")
    assert reader.get(PAGE).content == first.content


def test_another_process_gives_the_same_bytes_and_tag(reader: TestClient, sqlite_url: str) -> None:
    with browser(create_app(Config(database_url=sqlite_url))) as other:
        mine, theirs = reader.get(PAGE), other.get(PAGE)
    assert mine.headers["etag"] == theirs.headers["etag"]
    assert mine.content == theirs.content


def test_full_figures_are_the_released_ones_and_say_so(reader: TestClient) -> None:
    full = PAGE.replace("released", "full")
    assert "nothing is withheld here" in reader.get(full).text
    assert figures(reader, twin("json", QUERY.replace("released", "full"))) == figures(reader)


def test_the_twins_hold_the_same_numbers(reader: TestClient) -> None:
    table = orjson.loads(figures(reader))["single"]
    rows = list(csv.DictReader(io.StringIO(reader.get(twin("csv") + "&table=single").text)))
    assert [float(row["rate"]) for row in rows] == [row["rate"] for row in table["rows"]]
    assert [row["age"] for row in rows][:3] == ["0", "1", "2"]
    sheet = reader.get(twin("xlsx"))
    assert sheet.status_code == 200
    assert sheet.content[:2] == b"PK"


@pytest.mark.parametrize("of", ["cape.f.2014", "rock.m.2013", "north.p.2012"])
@pytest.mark.parametrize("settings", ["almanac-1", "almanac-1-kannisto", "almanac-1-smooth"])
def test_every_kind_of_population_has_its_page_and_twins(
    reader: TestClient, of: str, settings: str
) -> None:
    query = f"?of={of}&figures=released&settings={settings}"
    assert reader.get(PAGE.replace(QUERY, query)).status_code == 200
    assert orjson.loads(figures(reader, twin("json", query)))["curves"]["rows"]
    assert reader.get(twin("csv", query) + "&table=curves").status_code == 200
