"""The demonstration followed link by link: every page is there, and every twin opens as what it
says it is, with the tables the page is written from."""

import csv
import io
import re
from collections import defaultdict
from collections.abc import Callable
from pathlib import Path

import orjson
import pytest
from httpx2 import Response
from openpyxl import load_workbook

from server.app import create_app
from server.config import Config
from tests.house.crawl import walk
from tests.server.web.site import browser

pytestmark = pytest.mark.slow

STARTS = ("/", "/collections", "/methods", "/words", "/uploads")
NO_WORDS = re.compile(r"(?<![\w-])(nan|inf|None|Undefined|Traceback)(?![\w-])|\{\{|\}\}")


@pytest.fixture(scope="module")
def answers(copied: Callable[[], Path]) -> dict[str, Response]:
    """By address; a few addresses of each path."""
    with browser(create_app(Config(data=copied()))) as reader:
        reader.follow_redirects = True
        return dict(walk(reader, STARTS, each=5))


def of_type(answers: dict[str, Response], media_type: str) -> dict[str, Response]:
    found = {
        place: answer
        for place, answer in answers.items()
        if media_type in answer.headers.get("content-type", "")
    }
    assert found
    return found


def test_every_link_leads_to_an_answer(answers: dict[str, Response]) -> None:
    assert {
        place: one.status_code for place, one in answers.items() if one.status_code != 200
    } == {}
    assert len(answers) > 80


def test_no_page_shows_what_only_a_program_would_say(answers: dict[str, Response]) -> None:
    for place, answer in of_type(answers, "text/html").items():
        said = re.sub(r"<script.*?</script>", "", answer.text, flags=re.DOTALL)
        assert (found := NO_WORDS.search(said)) is None, f"{place}: {found}"


def test_every_csv_is_a_table(answers: dict[str, Response]) -> None:
    for place, answer in of_type(answers, "text/csv").items():
        assert answer.headers["content-disposition"].startswith("attachment; filename="), place
        heading, *rows = csv.reader(io.StringIO(answer.content.decode("utf-8")))
        assert len(set(heading)) == len(heading) > 1, place
        assert rows, place
        assert {len(row) for row in rows} == {len(heading)}, place


def test_json_and_workbook_hold_the_same_tables(answers: dict[str, Response]) -> None:
    tables: dict[str, dict[str, list[tuple[str, int]]]] = defaultdict(dict)
    for place, answer in of_type(answers, "application/json").items():
        content = orjson.loads(answer.content)
        figures, heads = content["figures"], content["tables"]
        assert figures.keys() == heads.keys(), place
        tables[place.replace(".json", "")]["json"] = [
            (key, len(table["rows"]) + ("total" in table)) for key, table in figures.items()
        ]
    for place, answer in of_type(answers, "spreadsheetml.sheet").items():
        book = load_workbook(io.BytesIO(answer.content), read_only=True)
        assert book.sheetnames[0] == "about", place
        tables[place.replace(".xlsx", "")]["xlsx"] = [
            (name, sum(1 for _row in book[name].iter_rows()) - 1) for name in book.sheetnames[1:]
        ]
    both = [pair for pair in tables.values() if len(pair) == 2]
    assert len(both) > 15
    for pair in both:
        assert pair["json"] == pair["xlsx"]
