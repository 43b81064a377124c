"""/methods and its twins, /words."""

import csv
import io

import pytest
from starlette.testclient import TestClient

from engine.indicators import GROUPS, INDICATORS
from engine.settings import SETTINGS


def test_every_entry_can_be_linked_to(blank: TestClient) -> None:
    text = blank.get("/methods").text
    chapters = [group.key for group in GROUPS]
    for key in (*chapters, *INDICATORS, *SETTINGS):
        assert text.count(f'id="{key}"') == 1
    for key in (*chapters, *SETTINGS):
        assert f'href="#{key}"' in text


@pytest.mark.parametrize("table", ["indicators", "settings", "standards", "checks"])
def test_each_list_is_a_file(blank: TestClient, table: str) -> None:
    rows = list(csv.DictReader(io.StringIO(blank.get(f"/methods.csv?table={table}").text)))
    in_json = blank.get("/methods.json").json()["figures"][table]["rows"]
    assert [list(row.values()) for row in rows] == [
        [str(value) for value in row.values()] for row in in_json
    ]
    assert rows


def test_a_repeat_is_known_by_its_tag(blank: TestClient) -> None:
    tag = blank.get("/words").headers["etag"]
    assert blank.get("/words", headers={"If-None-Match": tag}).status_code == 304
    assert blank.head("/methods").headers["etag"] == blank.get("/methods").headers["etag"]


@pytest.mark.parametrize(
    ("address", "status", "words"),
    [
        ("/methods?of=e0", 400, "key “of”"),
        ("/methods.csv?table=causes", 400, "it has indicators, settings, standards, checks"),
        ("/methods.pdf", 404, "there are .csv, .xlsx and .json"),
        ("/words?x=1", 400, "this page takes none"),
    ],
)
def test_what_cannot_be_answered_says_why(
    blank: TestClient, address: str, status: int, words: str
) -> None:
    answer = blank.get(address)
    assert answer.status_code == status
    assert words in answer.text
