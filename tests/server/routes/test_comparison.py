"""/c/{collection}/{edition}/comparison and its twins, as a reader meets them."""

import re
from dataclasses import replace

import numpy as np
import pytest
from starlette.testclient import TestClient

from server.store.connect import Session
from tests.factories import edition
from tests.server.routes.conftest import FIVE, counted

REST = "&figures=released&settings="


def asked(of: str, *, this: str = "north.f.2014", that: str = "north.f.2012") -> str:
    return f"?this={this}&that={that}&of={of}{REST}almanac-1"


@pytest.mark.parametrize("of", ["smr", "isr"])
@pytest.mark.parametrize("twin", ["", ".csv", ".json"])
def test_two_ratios_to_a_whole_are_not_compared(reader: TestClient, of: str, twin: str) -> None:
    answer = reader.get(f"/c/isle/1/comparison{twin}{asked(of)}")
    assert answer.status_code == 400
    assert "two of them do not compare" in answer.text
    assert "asr_esp2013" in answer.text


def test_the_form_offers_no_indicator_that_would_be_refused(reader: TestClient) -> None:
    text = reader.get(f"/c/isle/1/comparison{asked('gini')}").text
    assert 'value="gini" selected' in text
    assert 'value="asr_segi"' in text
    assert 'value="smr"' not in text
    trend = reader.get(reader.get("/c/isle/trend?of=smr").headers["location"]).text
    assert 'value="smr" selected' in trend


@pytest.mark.parametrize("of", ["asr_esp2013", "mode", "imr", "lower_quartile", "40q30", "yll70"])
def test_any_indicator_is_answered(reader: TestClient, of: str) -> None:
    answer = reader.get(f"/c/isle/1/comparison{asked(of)}")
    assert answer.status_code == 200
    drawn = 'data-chart="asked"' in answer.text
    assert drawn == (of not in ("mode", "imr"))
    assert ("is not shared out over ages" in answer.text) != drawn


def test_what_can_be_shown_without_life_expectancy_is_shown(
    writer: Session, reader: TestClient
) -> None:
    """Nobody died in the open group: no e0, but a standardised rate and its parts."""
    panels = {}
    for seed, year in enumerate(("2013", "2014")):
        panel = counted("f", seed, people=3e5)
        deaths = np.where(np.arange(len(FIVE)) == len(FIVE) - 1, 0, panel.deaths)
        panels[f"skerry.f.{year}"] = replace(panel, deaths=deaths)
    edition(writer, panels)
    sides = {"this": "skerry.f.2014", "that": "skerry.f.2013"}
    answer = reader.get(f"/c/isle/2/comparison{asked('asr_esp2013', **sides)}")
    assert answer.status_code == 200
    assert 'data-chart="asked"' in answer.text
    assert 'data-chart="by-age"' not in answer.text
    assert "Table of contributions by age" in answer.text
    bare = reader.get(f"/c/isle/2/comparison{asked('e0', **sides)}")
    assert bare.status_code == 200
    drawn = re.findall('data-chart="([a-z-]+)"', bare.text)
    assert drawn == ["deaths", "ratios", "rise"]  # what needs no life expectancy
