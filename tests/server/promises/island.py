"""Quillmere as a reader meets it: its addresses, and what each of them shows."""

import datetime as dt
import io
from collections.abc import Iterable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path

import orjson
from fastapi import FastAPI
from openpyxl import load_workbook
from starlette.testclient import TestClient

from engine.indicators import INDICATORS
from engine.panel import SEXES
from engine.settings import SETTINGS
from seed_scenarios import quillmere
from seed_scenarios.quillmere_counts import REGIONS, WHOLE, YEARS, counted
from seed_scenarios.quillmere_files import births_csv, deaths_csv, population_csv
from server.accounts.viewer import LOCAL
from server.actions.check_upload import check_upload
from server.actions.commit_upload import commit_upload
from server.actions.map_upload import map_upload
from server.actions.receive_upload import receive_upload
from server.app import create_app
from server.config import Config
from server.results.contents import ContentsQuestion
from server.results.questions import (
    ComparisonQuestion,
    CurvesQuestion,
    PopulationYear,
    PopulationYearQuestion,
    Question,
    TrendQuestion,
    address,
)
from server.store.connect import Session, make_engine, sessions
from tests.server.web.site import browser

AREAS = (WHOLE.code, *(region.code for region in REGIONS))
FIRST, REVISED, LAST = "1999", "2021", "2023"
EDITION = 2  # the one that stands when the demonstration has been loaded
NOW = dt.datetime(2026, 12, 1, 9, tzinfo=dt.UTC)


def application(folder: Path) -> FastAPI:
    """A process of its own, as far as the pages can tell: nothing is kept from another."""
    return create_app(Config(data=folder))


@contextmanager
def reading(folder: Path) -> Iterator[TestClient]:
    with browser(application(folder)) as reader:
        yield reader


@contextmanager
def writing(folder: Path) -> Iterator[Session]:
    engine = make_engine(Config(data=folder).url)
    with sessions(engine)() as session:
        yield session
    engine.dispose()


# ---- addresses -----------------------------------------------------------------------------------


def addresses(twin: str, edition: int = EDITION) -> tuple[str, ...]:
    """Every view of the demonstration: what a reader can ask for, with the years thinned out."""
    return tuple(address(quillmere.CODE, edition, one, twin=twin) for one in questions())


def sample(edition: int = EDITION) -> tuple[Question, ...]:
    """One of each kind: plain, closed at 85 under a law, simulated, compared, followed."""
    return (
        _life(WHOLE.code, "f", REVISED),
        _life("stonereach", "p", LAST, "almanac-1-kannisto"),
        _pair(("northlade", "m", REVISED), (WHOLE.code, "m", REVISED)),
        _trend("H", "almanac-1-gompertz"),
        _trend("mode_raw", "almanac-1"),
        CurvesQuestion(PopulationYear("northlade", "m", REVISED)),
        ContentsQuestion(),
    )


# one of each kind: as counted, modelled above, added up, borrowed
CHAINS = ("almanac-1", "almanac-1-kannisto", "almanac-1-3-years", "almanac-2")


def questions() -> Iterator[Question]:
    for number, area in enumerate(AREAS):  # each with one sex, in turn
        yield _life(area, SEXES[number % len(SEXES)], REVISED)
        yield CurvesQuestion(PopulationYear(area, "f", REVISED))
    for settings in CHAINS:
        for area in (WHOLE.code, "little-auk"):
            yield _life(area, "m", LAST, settings)
            yield _pair((area, "f", REVISED), (area, "m", REVISED), settings)
    for area in AREAS[1:]:
        yield _pair((area, "f", REVISED), (WHOLE.code, "f", REVISED))
        yield _pair((area, "p", LAST), (area, "p", FIRST))
        yield replace(_pair((area, "f", LAST), (WHOLE.code, "f", LAST)), overlap="rest")
        yield replace(_pair((area, "m", LAST), (area, "m", LAST)), standard="gbd2010")
    for settings in SETTINGS:
        yield ContentsQuestion(settings=settings)
        yield _trend("e0", settings)
    for indicator in tuple(INDICATORS)[::5]:
        yield _trend(indicator, CHAINS[0])


def _life(area: str, sex: str, period: str, settings: str = "almanac-1") -> PopulationYearQuestion:
    return PopulationYearQuestion(PopulationYear(area, sex, period), settings=settings)


def _pair(
    this: tuple[str, str, str], that: tuple[str, str, str], settings: str = "almanac-1"
) -> ComparisonQuestion:
    return ComparisonQuestion(PopulationYear(*this), PopulationYear(*that), settings=settings)


def _trend(of: str, settings: str) -> TrendQuestion:
    """Two areas; of those that take long, few years."""
    first = REVISED if INDICATORS[of].partials is None else FIRST
    return TrendQuestion(of, ("northlade", WHOLE.code), ("f", "m"), first, LAST, settings=settings)


# ---- what they show ------------------------------------------------------------------------------


def figures(reader: TestClient, place: str) -> bytes:
    """The bytes under "figures" of a .json twin; it is the last of its keys."""
    answer = reader.get(place)
    assert answer.status_code == 200, f"{place}: {answer.text[:300]}"
    return answer.content.split(b',"figures":', 1)[1]


def shown(
    reader: TestClient, asked: Iterable[Question], edition: int = EDITION
) -> dict[str, object]:
    """What the twins say of figures, by address: JSON and CSV (its last table) as bytes, workbooks
    by sheet."""
    found: dict[str, object] = {}
    for question in asked:
        json, xlsx, csv = (
            address(quillmere.CODE, edition, question, twin=twin)
            for twin in ("json", "xlsx", "csv")
        )
        written = found[json] = figures(reader, json)
        found |= {f"{xlsx} {name}": rows for name, rows in sheets(reader.get(xlsx).content)}
        last = list(orjson.loads(written.removesuffix(b"}\n")))[-1]
        place = f"{csv}&table={last}"
        answer = reader.get(place)
        assert answer.status_code == 200, place
        found[place] = answer.content
    return found


def sheets(content: bytes) -> Iterator[tuple[str, list[tuple[object, ...]]]]:
    """The tables of a workbook; its first sheet says what may change: editions and notices."""
    book = load_workbook(io.BytesIO(content), read_only=True)
    for name in book.sheetnames[1:]:
        yield name, list(book[name].iter_rows(values_only=True))


# ---- what happens to the data --------------------------------------------------------------------


def revise(session: Session) -> int:
    """A further edition in which every count of every area and year is another, and one area has a
    new name; its number."""
    counts = {
        code: replace(
            one, deaths=one.deaths * 2 + 1, population=one.population + 50, births=one.births + 7
        )
        for code, one in counted(revised=True).items()
    }
    made = {
        "deaths": deaths_csv(counts, YEARS, AREAS),
        "population": population_csv(counts, YEARS, AREAS),
        "births": births_csv(counts, YEARS, AREAS),
    }
    made = {role: text.replace(b",Northlade,", b",North and Cape,") for role, text in made.items()}
    upload = receive_upload(
        session,
        collection=quillmere.CODE,
        files=[(role, f"{role}.csv", content) for role, content in made.items()],
        by=LOCAL,
        now=NOW,
    )
    map_upload(
        session,
        upload_id=upload.id,
        mappings={role: quillmere.MAPPINGS[role] for role in made},
        basis=quillmere.BASIS,
        by=LOCAL,
        now=NOW,
    )
    check_upload(session, upload_id=upload.id)
    note = "Every count another."
    return commit_upload(session, upload_id=upload.id, note=note, by=LOCAL, now=NOW).number


def withdraw(reader: TestClient, edition: int, note: str) -> None:
    _post(reader, f"/c/{quillmere.CODE}/{edition}/withdraw", note)


def reinstate(reader: TestClient, edition: int, note: str = "") -> None:
    _post(reader, f"/c/{quillmere.CODE}/{edition}/reinstate", note)


def _post(reader: TestClient, place: str, note: str) -> None:
    answer = reader.post(place, data={"note": note})
    assert answer.status_code == 303, answer.text[:300]


def differing(before: Mapping[str, object], after: Mapping[str, object]) -> Sequence[str]:
    """Addresses whose figures are not the same any more."""
    assert before.keys() == after.keys()
    return [place for place, content in before.items() if after[place] != content]
