"""The whole site, walked by its own links: every link leads somewhere, and every word on the way
comes from the catalogue. A made-up language that sets each text in brackets tells."""

import datetime as dt
import re
from collections.abc import Iterator

import pytest
from httpx2 import Response
from starlette.testclient import TestClient

from seed_scenarios import quillmere
from seed_scenarios.quillmere_counts import REGIONS, WHOLE
from server.accounts.viewer import LOCAL
from server.actions.receive_upload import receive_upload
from server.app import create_app
from server.config import Config
from server.store.connect import make_engine, sessions
from server.store.migrating import migrate
from tests.house.crawl import read, walk

pytestmark = pytest.mark.house

NOW = dt.datetime(2026, 12, 1, 9, tzinfo=dt.UTC)
STARTS = ("/", "/collections", "/methods", "/words", "/uploads", "/nothing-here")
NAMES = {"Ebbline", "csv", "xlsx", "json", "CSV", "XLSX", "JSON", "SHA", "UTC", "ISO"}
SYMBOLS = {"edagger", "median", "mode", "almanac", "ageing_rate"}  # keys, as in addresses


@pytest.fixture(scope="module")
def pages(tmp_path_factory: pytest.TempPathFactory) -> Iterator[dict[str, Response]]:
    """All pages in the made-up language: the island, and one upload with faults."""
    config = Config(data=tmp_path_factory.mktemp("pseudo"), language="pseudo")
    migrate(config.url)
    engine = make_engine(config.url)
    with sessions(engine)() as session:
        quillmere.build(session, now=NOW)
        receive_upload(
            session,
            collection=quillmere.CODE,
            files=[("deaths", "faulty.csv", b"year,sex,age,deaths\n2001,f,0,-3\n2001,x,1+,2\n")],
            by=LOCAL,
            now=NOW,
        )
    engine.dispose()
    here = {"base_url": "http://127.0.0.1:8000", "client": ("127.0.0.1", 50000)}
    with TestClient(create_app(config), **here) as client:
        yield dict(walk(client, STARTS))


def test_every_link_leads_somewhere(pages: dict[str, Response]) -> None:
    dead = {address: answer.status_code for address, answer in pages.items()}
    assert {address for address, status in dead.items() if status >= 400} == {"/nothing-here"}


def test_every_kind_of_page_was_reached(pages: dict[str, Response]) -> None:
    views = ("contents", "population-year", "comparison", "trend")
    for view in views:
        for twin in ("", ".csv", ".xlsx", ".json"):
            found = [one for one in pages if re.match(rf"/c/quillmere/\d/{view}{twin}($|\?)", one)]
            assert found, f"no page links to a {view}{twin}"


def without_catalogue(text: str) -> str:
    """What is left when ⟦...⟧, which may hold others, is taken out."""
    while (shorter := re.sub(r"⟦[^⟦⟧]*⟧", " ", text)) != text:
        text = shorter
    return text


def known_words() -> set[str]:
    """Words that are data: names, codes and notes of the collection, and of files."""
    said = [
        quillmere.OFFICE.name,
        LOCAL.name,
        "All deaths, Quillmere",
        "faulty.csv",
        quillmere.CODE,
    ]
    said += [quillmere.BASIS.source, quillmere.BASIS.population_date, *quillmere.NOTES]
    said += [text for region in (*REGIONS, WHOLE) for text in (region.code, region.name)]
    return set(re.findall(r"[^\W\d_]{2,}", " ".join(said))) | NAMES | SYMBOLS


def test_every_word_comes_from_the_catalogue(pages: dict[str, Response]) -> None:
    data = known_words()
    bare: dict[str, set[str]] = {}
    for address, answer in pages.items():
        if not answer.headers["content-type"].startswith("text/html"):
            continue
        assert "⟦" in answer.text, address
        for text in read(answer.text).texts:
            left = set(re.findall(r"[^\W\d_]{2,}", without_catalogue(text))) - data
            if left and not re.fullmatch(r"\s*/\S*\s*|\s*[0-9a-f]{8,64}\s*", text):
                bare.setdefault(text.strip()[:80], set()).add(address)
    assert {text: sorted(where)[0] for text, where in bare.items()} == {}
