"""Odd spellings of an address: each leads to the pinned one at once, or is refused in words."""

import pytest
from starlette.testclient import TestClient

REST = "&figures=released&settings=almanac-1"
TREND = "/c/isle/1/trend.csv?of=e0&area=north&sex=f&sex=m&from=2012&to=2014" + REST


@pytest.mark.parametrize(
    "table", ["a%20b", "a+b", "a%26b=c", "%C3%BC", "x%0d%0aSet-Cookie:a", "%25", "%23", "%00"]
)
def test_no_spelling_of_a_table_is_redirected_for_ever(reader: TestClient, table: str) -> None:
    answer = reader.get(f"{TREND}&table={table}")
    if answer.status_code == 302:
        assert "set-cookie" not in answer.headers
        answer = reader.get(answer.headers["location"])
    assert answer.status_code == 400
    assert answer.json()["detail"].endswith("”; it has years, estimates.")


@pytest.mark.parametrize(
    ("address", "key"),
    [
        ("/c/isle/trend?from=٢٠١٢", "from"),
        ("/c/isle/trend?to=２０１４", "to"),
        ("/c/isle/population-year?of=north.f.٢٠١٤", "٢٠١٤"),
        ("/c/isle/trend?of=e٦٥", "of"),
        ("/c/isle/trend?of=e065", "of"),
    ],
)
def test_digits_are_those_of_addresses(reader: TestClient, address: str, key: str) -> None:
    answer = reader.get(address)
    assert answer.status_code == 400
    assert key in answer.text
