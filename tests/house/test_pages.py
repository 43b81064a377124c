"""The whole site, walked by its own links: every word on the way comes from the catalogue. A
made-up language that sets each text in brackets tells."""

import datetime as dt
import re
import shutil
from collections.abc import Iterator
from pathlib import Path

import pytest
from httpx2 import Response
from starlette.testclient import TestClient

from engine.causes.registry import NUMBERS
from engine.indicators import GROUPS
from engine.standards import STANDARDS
from seed_scenarios import quillmere, quillmere_causes
from seed_scenarios.quillmere_causes_files import CODED_TWICE
from seed_scenarios.quillmere_counts import REGIONS, WHOLE
from server.accounts.viewer import LOCAL
from server.actions import Mapping, Session
from server.actions.check_upload import check_upload
from server.actions.map_upload import map_upload
from server.actions.receive_upload import receive_upload
from server.app import create_app
from server.config import Config
from server.intake.checks import KINDS
from server.results.targets import TARGETS
from server.sentences import text
from server.sentences.languages import OTHERS, texts, translated
from server.store.connect import make_engine, sessions
from tests.house.crawl import read, walk

pytestmark = pytest.mark.house

NOW = dt.datetime(2026, 12, 1, 9, tzinfo=dt.UTC)
STARTS = ("/", "/collections", "/methods", "/words", "/uploads", "/nothing-here")
FAULTY = "YEAR,SEX,AGE,DEATHS\n2001,f,0,-3\n2001,x,1+,2\n2001,m,0-4,\n2001,m,5+,many\n"
NOTES_OF_BREAKS = ("after the census of 2021", "hot summer")
NAMES = {"Ebbline", "csv", "xlsx", "json", "CSV", "XLSX", "JSON", "SHA", "UTC", "ISO"}
CUT = re.compile(r"⟦[^⟦⟧…]*…|…[^⟦⟧]*⟧")  # names of rows that are too long for the phone
SYMBOLS = {"edagger", "median", "mode", "almanac", "ageing_rate"}  # keys, as in addresses


@pytest.fixture(scope="module")
def asked() -> Iterator[set[str]]:
    """Every text that pages pass through the catalogue while they are walked."""
    said: set[str] = set()
    with pytest.MonkeyPatch.context() as patched:
        bracketed = text.bracketed
        patched.setattr(text, "bracketed", lambda one: said.add(one) or bracketed(one))
        yield said


@pytest.fixture(scope="module")
def pages(
    asked: set[str], demonstration: Path, tmp_path_factory: pytest.TempPathFactory
) -> Iterator[dict[str, Response]]:
    """All pages in the made-up language: the island, and one upload with faults."""
    folder = shutil.copytree(demonstration, tmp_path_factory.mktemp("pseudo") / "data")
    config = Config(data=folder, language="pseudo")
    engine = make_engine(config.url)
    with sessions(engine)() as session:
        _hand_in_faults(session, checked=False)
        _hand_in_faults(session, checked=True)
    engine.dispose()
    here = {"base_url": "http://127.0.0.1:8000", "client": ("127.0.0.1", 50000)}
    with TestClient(create_app(config), **here) as client:
        yield dict(walk(client, STARTS))


def _hand_in_faults(session: Session, *, checked: bool) -> None:
    upload = receive_upload(
        session,
        collection=quillmere.CODE,
        files=[("deaths", "faulty.csv", FAULTY.encode())],
        by=LOCAL,
        now=NOW,
    )
    if checked:
        columns = Mapping(year="YEAR", sex="SEX", age="AGE", deaths="DEATHS", only_area="tollbay")
        map_upload(
            session,
            upload_id=upload.id,
            mappings={"deaths": columns},
            basis=quillmere.BASIS,
            by=LOCAL,
            now=NOW,
        )
        check_upload(session, upload_id=upload.id)


def test_every_kind_of_page_was_reached(pages: dict[str, Response]) -> None:
    refused = {address for address, answer in pages.items() if answer.status_code >= 400}
    assert refused == {"/nothing-here"}
    views = ("contents", "population-year", "curves", "comparison", "trend")
    views += ("what-if", "gaps", "exchange")
    for view in views:
        for twin in ("", ".csv", ".xlsx", ".json"):
            found = [one for one in pages if re.match(rf"/c/quillmere/\d/{view}{twin}($|\?)", one)]
            assert found, f"no page links to a {view}{twin}"


def without_catalogue(said: str) -> str:
    """What is left when ⟦...⟧, which may hold others, is taken out."""
    while (shorter := re.sub(r"⟦[^⟦⟧]*⟧", " ", CUT.sub("…", said))) != said:
        said = shorter
    return said


def known_words() -> set[str]:
    """Words that are data: names, codes and notes of the collection, and of files."""
    said = [quillmere.OFFICE.name, LOCAL.name, quillmere.NAME, quillmere.CODE, FAULTY]
    said += [quillmere.BASIS.source, quillmere.BASIS.population_date, *quillmere.NOTES]
    said += [quillmere.BASIS.vintage, quillmere.VINTAGE, *NOTES_OF_BREAKS, quillmere.POLICY]
    said += [text for region in (*REGIONS, WHOLE) for text in (region.code, region.name)]
    said += [quillmere_causes.NAME, quillmere_causes.NOTE, CODED_TWICE]
    said += [quillmere_causes.WHOLE, quillmere_causes.WHOLE_NAME]
    return set(re.findall(r"[^\W\d_]{2,}", " ".join(said))) | NAMES | SYMBOLS


def bare_words(html: str) -> set[str]:
    """Words of a page that bypassed the catalogue."""
    said = read(html)
    left = [without_catalogue(text) for text in (" ".join(said.running), *said.texts)]
    left = [re.sub(r"%\{[^}]*\}|</?extra>|\b[a-z]+\.csv\b", "", text) for text in left]
    words = re.findall(r"(?<![/\w.=&-])[^\W\d_]{2,}(?![/\w=])", " ".join(left))
    return set(words) - known_words()


def test_every_word_comes_from_the_catalogue(pages: dict[str, Response]) -> None:
    found: dict[str, str] = {}
    for address, answer in pages.items():
        if answer.headers["content-type"].startswith("text/html"):
            assert "⟦" in answer.text, address
            found |= dict.fromkeys(bare_words(answer.text), address)
    assert found == {}


@pytest.mark.parametrize("code", OTHERS)
def test_every_text_shown_is_translated(
    pages: dict[str, Response], asked: set[str], code: str
) -> None:
    """Texts that are looked up or made by the code, which no list of texts can hold."""
    said = {one for one in asked - as_published() if words(one)}
    assert len(said) > 1_000
    known = texts(code)
    lacking = [one for one in sorted(said) if one not in known and translated(code, one) == one]
    assert lacking == []


def words(said: str) -> bool:
    """Whether there is anything to translate beside what is filled in."""
    return bool(re.search(r"[^\W\d_]{2,}", re.sub(r"\{\w+\}", "", said)))


def as_published() -> set[str]:
    """Sources, which stand as they were published, and ends of addresses."""
    found = {one.source for group in GROUPS for one in group.indicators}
    found |= {one.source for one in (*NUMBERS.values(), *KINDS.values(), *TARGETS)}
    return found | {one.source for one in STANDARDS.values()}
