"""/c/{collection}/{edition}/what-if, gaps and exchange, as a reader meets them."""

import orjson
import pytest
from starlette.testclient import TestClient

END = "&figures=released&settings=almanac-1"
ROW = "&by=-20&from=30&to=59&sex=p&cause="
PLACES = {
    "what-if": f"/c/isle/1/what-if?at=north.f.2014&of=e0{ROW}{END}",
    "gaps": f"/c/isle/1/gaps?of=north.f.2014&least=100000{END}",
    "exchange": f"/c/isle/1/exchange?of=north.f.2014{END}",
}
TABLES = {"what-if": "deaths", "gaps": "areas", "exchange": "ages"}


@pytest.mark.parametrize("view", PLACES)
def test_the_page_answers_and_its_twins_hold_the_same(reader: TestClient, view: str) -> None:
    answer = reader.get(PLACES[view])
    assert answer.status_code == 200
    assert "women of North in 2014" in answer.text
    twin = PLACES[view].replace(f"{view}?", f"{view}.json?")
    table = orjson.loads(reader.get(twin).content)["figures"][TABLES[view]]
    sheet = reader.get(PLACES[view].replace(f"{view}?", f"{view}.csv?") + f"&table={TABLES[view]}")
    assert sheet.status_code == 200
    assert len(sheet.text.splitlines()) >= len(table["rows"])
    assert reader.get(PLACES[view].replace(f"{view}?", f"{view}.xlsx?")).content[:2] == b"PK"
    head = reader.head(PLACES[view])
    assert (head.status_code, head.headers["etag"]) == (200, answer.headers["etag"])


@pytest.mark.parametrize(
    ("spelled", "view"),
    [
        ("/c/isle/what-if?at=north.f.2014&by=-20&from=30&to=59", "what-if"),
        (
            "/c/isle/1/what-if?to=59&from=30&by=-20.0+%25&at_area=north&at_sex=f&at_period=2014",
            "what-if",
        ),
        (PLACES["what-if"] + "&by=&from=0&to=&sex=p&cause=&target=&toward_area=", "what-if"),
        ("/c/isle/gaps?of=north.f.2014", "gaps"),
        ("/c/isle/1/exchange?of_area=north&of_sex=f&of_period=2014", "exchange"),
    ],
)
def test_other_spellings_lead_to_the_pinned_one(
    reader: TestClient, spelled: str, view: str
) -> None:
    answer = reader.get(spelled)
    assert (answer.status_code, answer.headers["location"]) == (302, PLACES[view])


@pytest.mark.parametrize(
    ("address", "status", "words"),
    [
        (PLACES["what-if"] + "&off=1", 400, "key “off”"),
        (PLACES["what-if"].replace("from=30", "from=31"), 400, "not made up of the age groups"),
        (PLACES["what-if"].replace("cause=", "cause=heart"), 400, "no deaths by cause"),
        (PLACES["what-if"].replace("by=-20", "by=-120"), 400, "from -100"),
        (PLACES["what-if"].replace("north", "east"), 404, "areas are cape, north and rock"),
        (PLACES["gaps"].replace("100000", "5"), 400, "20000, 100000, 500000"),
        (PLACES["gaps"].replace("2014", "1950"), 404, "does not hold north.f.1950"),
        (PLACES["exchange"] + "&least=20000", 400, "key “least”"),
    ],
)
def test_what_cannot_be_answered_says_why(
    reader: TestClient, address: str, status: int, words: str
) -> None:
    answer = reader.get(address)
    assert answer.status_code == status
    assert words in answer.text


@pytest.mark.parametrize(
    ("of", "settings"),
    [
        ("cape.f.2014", "almanac-1-kannisto"),
        ("rock.m.2013", "almanac-1"),
        ("north.p.2012", "almanac-2"),
    ],
)
def test_every_kind_of_population_has_its_pages(reader: TestClient, of: str, settings: str) -> None:
    end = f"&figures=released&settings={settings}"
    for address in (
        f"/c/isle/1/what-if?at={of}&of=e0&by=-20&from=30&to=59&sex=p&cause={end}",
        f"/c/isle/1/gaps?of={of}&least=20000{end}",
        f"/c/isle/1/exchange?of={of}{end}",
    ):
        assert reader.get(address).status_code == 200


def test_pages_lead_to_one_another(reader: TestClient) -> None:
    for address in (
        f"/c/isle/1/population-year?of=north.f.2014{END}",
        f"/c/isle/1/comparison?this=north.f.2014&that=north.f.2013&of=e0{END}",
    ):
        answer = reader.get(address, follow_redirects=True)
        for view in PLACES:
            assert f'href="/c/isle/1/{view}?' in answer.text, (address, view)
