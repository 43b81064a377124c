"""JSON: figures by table, gaps with their kind, and nothing in the figures but figures."""

from dataclasses import replace

import orjson

from server.exports import json
from server.exports.table import Row
from tests.server.exports.tables import NAMED, YEARS, a_twin


def test_what_the_file_holds() -> None:
    content = orjson.loads(json.write(a_twin()))
    assert content["address"] == "/c/x/1/trend?of=e0"
    assert content["notices"] == [{"word": "Withdrawn", "text": "It was withdrawn."}]
    heads, figures = content["tables"]["years"], content["figures"]["years"]
    assert heads["title"] == YEARS.title
    assert heads["columns"][2] == {
        "key": "e0",
        "label": "women",
        "unit": "years",
        "group": "Saltmarsh",
    }
    assert figures["rows"][0] == {
        "year": 2011,
        "area": "=1+1",
        "e0": 1 / 3,
        "change": -0.125,
        "obs_status": "A",
    }
    assert figures["rows"][1]["e0"] == {
        "missing": "withheld",
        "reason": "few deaths",
        "obs_status": "Q",
        "conf_status": "C",
    }
    assert figures["rows"][1]["provisional"] is True
    assert figures["rows"][1]["obs_status"] == "P"
    assert figures["rows"][2]["change"] == {"missing": "nil", "obs_status": "A"}
    assert figures["total"] == {
        "year": "sum",
        "area": "",
        "e0": 82.5,
        "change": 0.375,
        "obs_status": "A",
    }


def test_a_sum_without_a_number_is_null_and_no_text() -> None:
    blank = replace(YEARS, total=Row(("sum", "", "", 0.375)))
    total = orjson.loads(json.write(a_twin(blank)))["figures"]["years"]["total"]
    assert total == {
        "year": "sum",
        "area": "",
        "e0": None,
        "change": 0.375,
        "obs_status": "A",
    }


def test_notices_and_new_names_leave_the_bytes_of_the_figures_as_they_are() -> None:
    before = json.write(a_twin())
    columns = tuple(replace(column, label="New", span="Names") for column in YEARS.columns)
    named = (replace(YEARS, title="Another title", columns=columns),)
    after = json.write(replace(a_twin(), notices=(), tables=named))
    assert before != after
    assert before.partition(b'"figures"')[2] == after.partition(b'"figures"')[2]


def test_names_stand_beside_the_figures() -> None:
    content = orjson.loads(json.write(a_twin(NAMED)))
    assert content["tables"]["areas"]["names"] == {"st.john": "St John"}
    assert content["figures"]["areas"]["rows"][0] == {
        "area": "st.john",
        "e0": 80.5,
        "obs_status": "A",
    }


def test_every_number_of_the_table_is_in_the_file() -> None:
    rows = orjson.loads(json.write(a_twin()))["figures"]["years"]["rows"]
    for row, written in zip(YEARS.rows, rows, strict=True):
        for column, cell in zip(YEARS.columns, row.cells, strict=True):
            if isinstance(cell, float):
                assert written[column.key] == cell
