"""Tags of pinned pages: the same in every process, known again, and found without calculation."""

import threading
from collections.abc import Callable, Iterator
from contextlib import ExitStack, closing
from pathlib import Path
from types import FrameType

import pytest
from httpx2 import Client
from starlette.testclient import TestClient

import engine
from seed_scenarios import quillmere
from server.results.questions import address
from tests.browser.site import Site
from tests.server.promises.island import EDITION, reading, sample, withdraw

pytestmark = pytest.mark.slow

PLACES = [
    address(quillmere.CODE, EDITION, one, twin=twin)
    for number, one in enumerate(sample())
    for twin in (("", "json", "xlsx") if number == 0 else ("", "json"))
]
PAGES = [address(quillmere.CODE, EDITION, one) for one in sample()]
PLAIN = ("/collections", "/collections.json", "/methods", "/c/quillmere/editions.xlsx")


@pytest.fixture
def two_servers(copied: Callable[[], Path], monkeypatch: pytest.MonkeyPatch) -> Iterator[list[str]]:
    """Addresses of two processes on one data folder, which order sets and dicts differently."""
    folder = copied()
    with ExitStack() as running:
        sites = []
        for seed in ("1", "2"):
            monkeypatch.setenv("PYTHONHASHSEED", seed)
            site = Site(folder)
            running.callback(site.stop)
            sites.append(site.start())
        yield [site.address for site in sites]
        assert "Traceback" not in sites[0].said()


def test_two_processes_answer_head_and_get_with_one_tag(two_servers: list[str]) -> None:
    with ExitStack() as opened:
        first, second = (
            opened.enter_context(closing(Client(base_url=one, timeout=60))) for one in two_servers
        )
        for place in (*PLACES, *PLAIN):
            head = first.head(place)
            assert (head.status_code, head.content) == (200, b""), place
            there, here = second.get(place), first.get(place)
            assert there.status_code == 200
            tags = {answer.headers["etag"] for answer in (head, here, there)}
            assert len(tags) == 1, place
            assert here.content == there.content, place
            assert int(head.headers["content-length"]) == len(here.content), place
            known = second.get(place, headers={"If-None-Match": head.headers["etag"]})
            assert (known.status_code, known.content) == (304, b""), place
            assert known.headers["etag"] == head.headers["etag"], place


def test_no_two_addresses_share_a_tag(island: Path) -> None:
    with reading(island) as reader:
        tags = [reader.head(place).headers["etag"] for place in PLACES]
        full = [reader.head(place.replace("released", "full")).headers["etag"] for place in PAGES]
    assert len({*tags, *full}) == len(PLACES) + len(PAGES)


def test_a_withdrawal_changes_the_tag_and_a_known_page_is_sent_again(
    copied: Callable[[], Path],
) -> None:
    with reading(copied()) as reader:
        before = {place: reader.head(place).headers["etag"] for place in PAGES}
        withdraw(reader, EDITION, "Sent by mistake.")
        for place, tag in before.items():
            answer = reader.get(place, headers={"If-None-Match": tag})
            assert answer.status_code == 200, place
            assert answer.headers["etag"] != tag, place


# ---- no engine code -----------------------------------------------------------------------------

_ENGINE = str(Path(engine.__path__[0]))


class Calls:
    """Functions of the engine that were called, in any thread started while it watches. Looking an
    entry up in a registry calculates nothing."""

    def __init__(self) -> None:
        self.seen: list[str] = []

    def __call__(self, frame: FrameType, event: str, _arg: object) -> None:
        code = frame.f_code
        if event == "call" and code.co_filename.startswith(_ENGINE) and code.co_name != "find":
            self.seen.append(f"{code.co_filename.removeprefix(_ENGINE)}:{code.co_name}")

    def taken(self) -> list[str]:
        seen, self.seen = self.seen, []
        return seen


@pytest.fixture
def calls() -> Iterator[Calls]:
    watching = Calls()
    threading.setprofile(watching)
    yield watching
    threading.setprofile(None)


def _revisited(reader: TestClient, place: str, tag: str, calls: Calls) -> None:
    """Asked again with the tag, and asked for the bytes again: neither calculates."""
    known = reader.get(place, headers={"If-None-Match": tag})
    assert (known.status_code, calls.taken()) == (304, []), place


@pytest.mark.parametrize("place", PLACES)
def test_a_repeat_of_a_pinned_page_runs_no_engine_code(
    island: Path, calls: Calls, place: str
) -> None:
    with reading(island) as reader:  # its threads are started under the watch
        first = reader.get(place)
        assert len(calls.taken()) > 100, "the first time it is worked out"
        again = reader.get(place)
        assert (again.content, calls.taken()) == (first.content, [])
        assert (reader.head(place).status_code, calls.taken()) == (200, [])
        _revisited(reader, place, first.headers["etag"], calls)
    with reading(island) as another:  # nothing is kept in it, and it need not calculate to know
        _revisited(another, place, first.headers["etag"], calls)
