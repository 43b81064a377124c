"""Names, notes and file names are words, whatever stands in them: no markup, no formula.

One name holds what would be markup to a browser and to the charts, a part to fill in to the text
catalogue and to a hover label, and a formula to a spreadsheet.
"""

import csv
import io
import json
import re
from html.parser import HTMLParser

import pytest
from starlette.testclient import TestClient

from tests.factories import counts_csv
from tests.server.routes.test_uploads import AREAS, NEW

STRANGE = "=<img src=x onerror=alert(1)>&amp;'\"{x} {{ y }} %{y} </script> @ink 100 %s"
SAID = AREAS | {
    "counts.area_name": "area_name",
    "source": STRANGE,
    "population_date": STRANGE,
    "whole": "isle",
    "whole_name": STRANGE,
}
REST = "figures=released&settings=almanac-1"
VIEWS = (
    f"/c/dk/1/contents{{}}?{REST}",
    f"/c/dk/1/population-year{{}}?of=isle.p.2002&{REST}",
    f"/c/dk/1/comparison{{}}?this=north.f.2002&that=isle.m.2001&of=e0&{REST}",
    f"/c/dk/1/trend{{}}?of=e0&area=isle&area=north&sex=f&from=2001&to=2002&{REST}",
    "/collections{}",
    "/c/dk/editions{}",
    "/uploads/1/problems{}",
)
PAGES = (*(view.format("") for view in VIEWS), "/uploads", "/uploads/1", "/uploads/new")


def counts() -> bytes:
    """The counts of the factory, on a scale that makes a figure, with a name for each area."""
    head, *rows = counts_csv(times=40).decode().splitlines()
    named = csv_line([STRANGE])
    wide = (re.sub(r"(\d+)$", r"\g<1>00", row) for row in rows)
    return "\n".join([f"{head},area_name", *(f"{row},{named}" for row in wide)]).encode()


def csv_line(cells: list[str]) -> str:
    out = io.StringIO()
    csv.writer(out, lineterminator="").writerow(cells)
    return out.getvalue()


@pytest.fixture
def strange(blank: TestClient) -> TestClient:
    """A reader of a collection in which every name is strange; edition 1 is withdrawn."""
    asked = NEW | {"name": STRANGE, "owner": STRANGE}
    files = {"counts": (f"{STRANGE.replace('/', '')}.csv", counts(), "text/csv")}
    assert blank.post("/uploads", data=asked, files=files).status_code == 303
    assert blank.get("/uploads/1/reading").status_code == 200
    assert blank.post("/uploads/1/reading", data=SAID).status_code == 303
    assert blank.get("/uploads/1/problems").status_code == 200
    answer = blank.post("/uploads/1/commit", data={"note": STRANGE})
    assert answer.status_code == 303, answer.text
    assert blank.post("/c/dk/1/withdraw", data={"note": STRANGE}).status_code == 303
    return blank


class Elements(HTMLParser):
    """What a browser makes of a page."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.found: set[str] = set()
        self.handlers: list[str] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.found.add(tag)
        self.handlers += [name for name, _text in attrs if name.startswith("on")]


@pytest.mark.parametrize("place", PAGES)
def test_no_name_becomes_markup_or_a_fault(strange: TestClient, place: str) -> None:
    answer = strange.get(place)
    assert answer.status_code == 200
    seen = Elements(answer.text)
    assert "img" not in seen.found
    assert seen.handlers == []
    assert "{x} {{ y }} %{y}" in answer.text  # as it was written


def test_no_name_becomes_markup_in_a_picture(strange: TestClient) -> None:
    drawn = 0
    for view in VIEWS[:4]:
        text = strange.get(view.format("")).text
        for block in re.findall(r'<script type="application/json"[^>]*>(.*?)</script>', text):
            figure = json.loads(block)
            words = [note["text"] for note in figure["layout"]["annotations"]]
            labels = [trace.get("hovertemplate", "") for trace in figure["data"]]
            drawn += sum("&lt;img src=x" in one for one in (*words, *labels))
            assert not any("<img" in one for one in (*words, *labels))
            assert not any("}} %{y}" in one for one in labels)
    assert drawn


@pytest.mark.parametrize("view", VIEWS)
def test_no_name_becomes_a_formula(strange: TestClient, view: str) -> None:
    place = view.format(".csv")
    answer = strange.get(place)
    if answer.status_code == 302:
        answer = strange.get(answer.headers["location"])
    assert answer.status_code == 200
    cells = [cell for row in csv.reader(io.StringIO(answer.text)) for cell in row]
    assert not any(cell.startswith("=") for cell in cells)
    assert strange.get(view.format(".xlsx")).status_code == 200
    assert strange.get(view.format(".json")).json()
