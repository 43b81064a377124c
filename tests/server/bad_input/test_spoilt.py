"""Spoilt files through the pages: never a failure, and no edition is changed."""

import random

import pytest
from starlette.testclient import TestClient

from tests.studies.fuzz import spoilt

FILES = 40


@pytest.mark.parametrize("seed", range(FILES))
def test_a_spoilt_file_leads_to_a_page(reader: TestClient, seed: int) -> None:
    name, content = spoilt(random.Random(f"pages/{seed}"))
    handed = {"counts": (name, content, "application/octet-stream")}
    sent = reader.post("/uploads", data={"collection": "saltmarsh"}, files=handed)
    assert sent.status_code == 303, sent.text
    place = sent.headers["location"].removesuffix("/reading")
    assert reader.get(f"{place}/reading").status_code == 200
    asked = {
        "people": "residents",
        "dated_by": "death",
        "population_is": "midyear",
        "population_date": "1 July",
        "source": "the office",
    }
    asked |= {f"counts.{field}": field for field in ("area", "year", "sex", "age")}
    asked |= {f"counts.{field}": field for field in ("deaths", "population")}
    checked = reader.post(f"{place}/reading", data=asked)
    assert checked.status_code in (303, 422), checked.text
    assert reader.get(f"{place}/problems").status_code in (200, 302)
