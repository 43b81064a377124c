"""/c/{collection}/{edition}/causes and its twins, as a reader meets them."""

import csv
import io
from collections.abc import Callable, Iterator
from contextlib import AbstractContextManager

import orjson
import pytest
from starlette.testclient import TestClient

from server.app import create_app
from server.config import Config
from server.intake.causes.lists import SHORT
from server.store.connect import make_engine, sessions
from tests.factories import edition, gompertz_panel, parted
from tests.server.web.site import browser

KEPT = "causes=groups&ill_defined=kept&undetermined=kept&ratios=kept"
END = f"{KEPT}&figures=released&settings=almanac-1"
QUERY = f"?of=north.f.2014&{END}"
PAGE = f"/c/isle/1/causes{QUERY}"


@pytest.fixture
def address(sqlite_url: str) -> str:
    """A database with the north by cause, and a collection without causes."""
    leaves = [one.code for one in SHORT if one.code not in {other.parent for other in SHORT}]
    engine = make_engine(sqlite_url)
    with sessions(engine)() as session:
        panels, counts = {}, {}
        for seed, year in enumerate(("2013", "2014")):
            for sex in "fm":
                name = f"north.{sex}.{year}"
                panels[name] = gompertz_panel(sex=sex, seed=seed, people=4e5)
                own = parted(panels[name], len(leaves), seed=seed).deaths
                counts[name] = {code: own[at] for at, code in enumerate(leaves)}
        edition(session, panels, causes=SHORT, by_cause=counts)
        edition(session, {"north.f.2014": gompertz_panel()}, code="bare")
    engine.dispose()
    return sqlite_url


@pytest.fixture
def reader(address: str) -> Iterator[TestClient]:
    with browser(create_app(Config(database_url=address))) as client:
        yield client


def test_the_page_answers_with_a_sentence_and_offers_help(reader: TestClient) -> None:
    answer = reader.get(PAGE)
    assert answer.status_code == 200
    assert "years lost per death of women of North in 2014" in answer.text
    assert "a help line of your country" in " ".join(answer.text.split())


@pytest.mark.parametrize(
    ("spelled", "pinned"),
    [
        ("/c/isle/causes?of=north.f.2014", PAGE),
        ("/c/isle/1/causes?of_area=north&of_sex=f&of_period=2014", PAGE),
        ("/c/isle/1/causes?of=north.f.2014&ratios=kept&causes=groups", PAGE),
        (
            "/c/isle/1/causes?avoidable=stroke&cause=falls&avoidable=falls&of=north.f.2014",
            f"/c/isle/1/causes?of=north.f.2014&cause=falls&avoidable=falls&avoidable=stroke&{END}",
        ),
        (
            "/c/isle/1/causes?ill_defined=spread&of=north.f.2014&avoidable=falls&avoidable=falls",
            f"/c/isle/1/causes?of=north.f.2014&avoidable=falls&{END}".replace(
                "ill_defined=kept", "ill_defined=spread"
            ),
        ),
    ],
)
def test_other_spellings_lead_to_the_pinned_one(
    reader: TestClient, spelled: str, pinned: str
) -> None:
    answer = reader.get(spelled)
    assert (answer.status_code, answer.headers["location"]) == (302, pinned)
    assert reader.get(pinned).status_code == 200


@pytest.mark.parametrize(
    ("place", "status", "words"),
    [
        (PAGE.replace("causes=groups", "causes=some"), 400, "it can be groups, causes"),
        (PAGE.replace("of=north.f.2014", "of=north.f.2014&cause=a b"), 400, "a code has 1 to 32"),
        (PAGE.replace("of=north.f.2014", "of=north.f.2014&cause=plague"), 404, "has no plague"),
        (PAGE.replace("2014", "1999"), 404, "does not hold north.f.1999"),
        ("/c/bare/1/causes?of=north.f.2014", 404, "holds no deaths by cause"),
        (f"/c/bare/1/causes{QUERY}", 404, "holds no deaths by cause"),
        (PAGE + "&colour=red", 400, "which this page does not know"),
    ],
)
def test_what_cannot_be_answered_says_why(
    reader: TestClient, place: str, status: int, words: str
) -> None:
    answer = reader.get(place)
    assert answer.status_code == status
    assert words in answer.text


def test_twins_hold_the_same_numbers(reader: TestClient) -> None:
    held = orjson.loads(reader.get(f"/c/isle/1/causes.json{QUERY}").content)["tables"]
    assert set(held) == {
        *("causes", "rates", "lives", "ages", "unevenness"),
        *("premature", "targets", "course"),
    }
    for key in held:
        answer = reader.get(f"/c/isle/1/causes.csv{QUERY}&table={key}")
        assert answer.status_code == 200, key
        assert len(list(csv.reader(io.StringIO(answer.text)))) >= 3
    assert reader.get(f"/c/isle/1/causes.xlsx{QUERY}").status_code == 200


def test_the_operators_text_stands_there_and_moves_the_tag(address: str) -> None:
    tags = set()
    for text in ("", "Isle help: 116 123", "Isle help: 116 124"):
        with browser(create_app(Config(database_url=address, help_line=text))) as client:
            answer = client.get(PAGE)
            assert text in answer.text
            tags.add(answer.headers["etag"])
    assert len(tags) == 3


def test_eight_statements_at_most(
    reader: TestClient, count_statements: Callable[[], AbstractContextManager[list[str]]]
) -> None:
    each = PAGE.replace("causes=groups", "causes=causes").replace("ratios=kept", "ratios=applied")
    for place in (PAGE, each, PAGE.replace("north.f", "north.p")):
        with count_statements() as statements:
            assert reader.get(place).status_code == 200
        assert len(statements) <= 8, statements
