"""The form that looks a printed table up, and its answer as a page and as JSON."""

import pytest
from starlette.testclient import TestClient

from server.routes import reproduce

TREND = (
    "/c/isle/1/trend{twin}?of=e0&area=north&sex=f&from=2012&to=2014&figures=released"
    "&settings=almanac-1"
)


def test_a_saved_file_is_looked_up(reader: TestClient) -> None:
    assert "Look it up" in reader.get("/reproduce").text
    content = reader.get(TREND.format(twin=".xlsx")).content
    sent = {"file": ("trend.xlsx", content, "application/octet-stream")}
    page = reader.post("/reproduce", files=sent)
    assert page.status_code == 200
    assert "All 6 figures of trend.xlsx are matched." in page.text
    told = reader.post("/reproduce", files=sent, data={"as": "json"}).json()
    assert {row["verdict"] for row in told["figures"]["figures"]["rows"]} == {"matched"}
    assert reader.get("/uploads").text.count("trend.xlsx") == 0


def test_what_cannot_be_looked_up_is_refused(reader: TestClient) -> None:
    assert reader.post("/reproduce", data={"edition": "1"}).status_code == 422
    empty = {"file": ("t.csv", b"", "text/csv")}
    answer = reader.post("/reproduce", files=empty)
    assert answer.status_code == 422
    assert "This table cannot be looked up" in answer.text
    assert "address cannot be read" not in answer.text
    table = {"file": ("t.csv", b"area,sex,year,value\nnorth,f,2014,8\n", "text/csv")}
    assert reader.post("/reproduce", files=table, data={"edition": "7"}).status_code == 422


def test_above_the_cap_it_is_a_question_too_large(
    reader: TestClient, monkeypatch: pytest.MonkeyPatch
) -> None:
    content = reader.get(TREND.format(twin=".xlsx")).content
    sent = {"file": ("trend.xlsx", content, "application/octet-stream")}
    monkeypatch.setattr(reproduce, "MOST", 5)
    answer = reader.post("/reproduce", files=sent)
    assert answer.status_code == 422
    assert "Too large a question" in answer.text
    assert "ebbline reproduce FILE" in answer.text
