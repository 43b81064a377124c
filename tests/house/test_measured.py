"""The table of the engine's ratios is the one that was measured."""

import json

import pytest

from tests.benchmarks.__main__ import RESULTS, markdown
from tests.house.tree import ROOT

pytestmark = pytest.mark.house


def test_developers_md_has_the_table_of_the_record() -> None:
    record = json.loads(RESULTS.read_text(encoding="utf-8"))
    text = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
    assert markdown(record) in text
    assert f"At commit {record['commit']}" in text


def test_what_is_void_says_so() -> None:
    record = json.loads(RESULTS.read_text(encoding="utf-8"))
    for one in record["results"]:
        assert one["void"] == (one["spread"] > 1.3), one["what"]
        assert ("(void)" in markdown({"results": [one]})) == one["void"]
