"""Who is answered, and with which headers."""

import asyncio
import logging
from collections.abc import Iterator
from pathlib import Path

import pytest
from starlette.testclient import TestClient
from starlette.types import Message

from server.web.guard import DRAINED, FIXED
from tests.server.web.site import HERE, Site, application, browser

SAME = {"Sec-Fetch-Site": "same-origin"}


@pytest.mark.parametrize("path", ["/small", "/nothing", "/missing.json", "/static/x/y", "/healthz"])
def test_every_answer_has_the_fixed_headers(reader: TestClient, path: str) -> None:
    answer = reader.get(path)
    for name, value in FIXED.items():
        assert answer.headers[name] == value
    assert answer.headers["x-request-id"].count("-") == 1
    assert answer.headers["server-timing"].startswith("total;dur=")


@pytest.mark.parametrize(
    ("client", "host", "status"),
    [
        ("127.0.0.1", "localhost:8000", 200),
        ("127.0.0.9", "127.0.0.1", 200),
        ("::1", "[::1]:8000", 200),
        ("::ffff:127.0.0.1", "[::1]", 200),
        ("192.0.2.7", "localhost", 403),
        ("not an address", "localhost", 403),
        ("127.0.0.1", "almanac.example", 403),
        ("127.0.0.1", "localhost.example:80", 403),
        ("fe80::1", "[::1]", 403),
    ],
)
def test_only_this_computer_is_answered_under_its_own_names(
    tmp_path: Path, client: str, host: str, status: int
) -> None:
    with browser(application(Site(), tmp_path), client=(client, 1), host=host) as reader:
        answer = reader.get("/small")
    assert answer.status_code == status
    if status == 403:
        assert "Ebbline answers" in answer.text
        assert "Problem 403, request " in answer.text


@pytest.mark.parametrize(
    ("host", "status"),
    [
        ("LOCALHOST:8000", 200),
        ("localhost:80@almanac.example", 403),
        ("localhost:80/almanac", 403),
        ("localhost:", 403),
        ("localhost.", 403),
        ("127.0.0.1.example", 403),
        ("", 403),
    ],
)
def test_a_name_is_read_whole(reader: TestClient, host: str, status: int) -> None:
    assert reader.get("/small", headers={"Host": host}).status_code == status


@pytest.mark.parametrize(
    ("headers", "status"),
    [
        ({"Sec-Fetch-Site": "same-origin"}, 200),
        ({"Sec-Fetch-Site": "none"}, 200),
        ({"Sec-Fetch-Site": "cross-site"}, 403),
        ({"Sec-Fetch-Site": "same-site", "Origin": "http://127.0.0.1:8000"}, 403),
        ({"Origin": "http://127.0.0.1:8000"}, 200),
        ({"Origin": "http://127.0.0.1:9000"}, 403),
        ({"Origin": "null"}, 403),
        ({"Origin": "http://["}, 403),
        ({"Origin": "//127.0.0.1:8000"}, 403),
        ({"Origin": "http://x@127.0.0.1:8000"}, 403),
        ({"Cookie": "a=b"}, 403),
        ({}, 200),
    ],
)
def test_a_form_of_another_site_is_refused(
    reader: TestClient, headers: dict[str, str], status: int
) -> None:
    assert reader.post("/done", headers=headers).status_code == status


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("X-Forwarded-For", "127.0.0.1"),
        ("Forwarded", "for=192.0.2.7"),
        ("X-Real-IP", "192.0.2.7"),
        ("X-Forwarded-Host", "almanac.example"),
    ],
)
def test_what_a_proxy_passes_on_is_not_answered(reader: TestClient, name: str, value: str) -> None:
    answer = reader.get("/small", headers={name: value})
    assert answer.status_code == 403
    assert "Ebbline answers only the computer it runs on" in answer.text


@pytest.mark.parametrize("path", ["/counted/" + "9" * 5_000, "/c/isle/" + "9" * 5_000 + "/trend"])
def test_an_address_without_end_gets_a_sentence(reader: TestClient, path: str) -> None:
    answer = reader.get(path)
    assert answer.status_code == 414
    assert "This address is longer than that of any page." in answer.text


@pytest.fixture
def small_limit(tmp_path: Path) -> Iterator[TestClient]:
    with browser(application(Site(), tmp_path, upload_limit=1_000_000)) as client:
        yield client


def test_a_body_above_the_limit_gets_a_sentence(small_limit: TestClient) -> None:
    answer = small_limit.post("/done", content=b"x" * 1_100_000, headers=SAME)
    assert answer.status_code == 413
    assert "What was sent is larger than 1 MB." in answer.text
    fits = small_limit.post("/done", content=b"x" * 900_000, headers=SAME)
    assert (fits.status_code, fits.text) == (200, "900000")


@pytest.mark.parametrize(
    ("parts", "status", "taken"),
    [
        (10, 200, 10),
        (11, 413, 11),  # read to its end, so that a browser shows the answer
        (50, 413, 50),
        (200, 413, DRAINED * 10 + 1),  # but not for ever
    ],
)
def test_a_body_in_parts_is_counted_as_it_comes(
    tmp_path: Path, parts: int, status: int, taken: int
) -> None:
    left = [{"type": "http.request", "body": b"x" * 100, "more_body": True}] * (parts - 1)
    left.append({"type": "http.request", "body": b"x" * 100, "more_body": False})
    answered: list[Message] = []

    async def receive() -> Message:
        return left.pop(0)

    async def send(message: Message) -> None:
        answered.append(message)

    scope = {"type": "http", "method": "POST", "path": "/done", "raw_path": b"/done"}
    scope |= {"client": HERE, "headers": [(b"host", b"localhost")], "query_string": b""}
    asyncio.run(application(Site(), tmp_path, upload_limit=1_000)(scope, receive, send))
    assert [one["status"] for one in answered if "status" in one] == [status]
    assert parts - len(left) == taken


def test_a_fault_is_told_with_the_id_that_is_in_the_log(
    reader: TestClient, caplog: pytest.LogCaptureFixture
) -> None:
    with caplog.at_level(logging.ERROR, logger="ebbline"):
        answer = reader.get("/broken")
    assert answer.status_code == 500
    assert "This page could not be made, and the fault is not yours." in answer.text
    assert answer.headers["x-request-id"] in caplog.text
    assert "a fault" in caplog.text
    assert "a fault" not in answer.text
    assert reader.get("/small").status_code == 200
