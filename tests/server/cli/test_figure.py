"""`ebbline figure` prints the numbers of the pages."""

import csv
import io
import json
import os
import subprocess
import sys
from dataclasses import replace

import numpy as np
import pytest
from starlette.testclient import TestClient

from server.app import create_app
from server.config import Config
from server.store.connect import make_engine, sessions
from tests.factories import edition, gompertz_panel
from tests.house.tree import ROOT
from tests.server.cli.conftest import Ebbline
from tests.server.web.site import browser


@pytest.fixture
def isle(sqlite_url: str) -> str:
    engine = make_engine(sqlite_url)
    with sessions(engine)() as session:
        panels = {
            f"north.{sex}.{year}": gompertz_panel(sex=sex, seed=year, people=1e6)
            for sex in "fm"
            for year in (2013, 2014)
        }
        panels["rock.f.2014"] = gompertz_panel(seed=1, people=2_000)
        edition(session, panels, provisional=("2014",))
    engine.dispose()
    return sqlite_url


def test_the_numbers_are_those_of_the_trend(ebbline: Ebbline, isle: str) -> None:
    printed = ebbline("figure", "e0", "--collection", "isle", "--as", "csv").out
    rows = list(csv.DictReader(io.StringIO(printed)))
    with browser(create_app(Config(database_url=isle))) as client:
        client: TestClient
        pinned = client.get("/c/isle/trend.json?of=e0").headers["location"]
        trend = client.get(pinned).json()["figures"]["estimates"]["rows"]
    values = {(row["area"], row["sex"], row["year"]): float(row["value"]) for row in rows}
    assert len(values) == len(trend) == 4
    assert sorted(values.values()) == sorted(row["value"] for row in trend)


def test_gaps_are_named_with_their_reason(ebbline: Ebbline, isle: str) -> None:
    said = ebbline("figure", "e0", "--collection", "isle", "--area", "rock", "--from", "2014")
    assert "undefined" in said.out
    assert "person-years were lived: too few" in said.out
    assert "not available" in said.out  # no men were counted there
    assert said.out.splitlines()[0].split() == ["indicator", "area", "sex", "year", "value", "unit"]


def test_provisional_years_are_marked(ebbline: Ebbline, isle: str) -> None:
    lines = ebbline("figure", "e0", "--collection", "isle", "--sex", "f").out.splitlines()
    assert " p (" not in lines[1]
    assert " p (" in lines[2]
    assert lines[-1] == "p: provisional"


def test_several_indicators_each_in_its_own_unit(ebbline: Ebbline, isle: str) -> None:
    said = ebbline(
        *("figure", "e0", "e33", "5q0", "--collection", "isle", "--sex", "f"),
        *("--to", "2013", "--as", "json"),
    )
    told = json.loads(said.out)
    rows = told["figures"]["figures"]["rows"]
    assert [(row["indicator"], row["unit"]) for row in rows] == [
        ("e0", "years"),
        ("e33", "years"),
        ("5q0", "per 1,000 births"),
    ]
    assert len(told["address"].split()) == 3


def test_a_withdrawn_edition_says_so_beside_its_figures(ebbline: Ebbline, isle: str) -> None:
    asked = ("figure", "e0", "--collection", "isle", "--edition", "1", "--as", "json")
    before = ebbline(*asked)
    assert before.err == ""
    withdraw = ("withdraw", "--collection", "isle", "--edition", "1", "--note", "Wrong file")
    assert ebbline(*withdraw).code == 0
    after = ebbline(*asked)
    assert after.err.startswith("Withdrawn. Edition 1 was withdrawn on ")
    told, was = json.loads(after.out), json.loads(before.out)
    assert [notice["word"] for notice in told["notices"]] == ["Withdrawn"]
    assert told["figures"] == was["figures"]


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        (("xx",), "The key “of” has the value “xx”; it can be e0, e65,"),
        (("e0", "--collection", "reef"), "There is no collection reef; known: isle."),
        (("e0", "--edition", "7"), "There is no edition 7; known: 1."),
        (("e0", "--edition", "0"), "There is no edition 0; known: 1."),
        (("e0", "--collection", "a/b"), "“a/b” is no code of a collection"),
        (("e0", "--area", "east"), "north and rock"),
        (("e0", "--from", "2014", "--to", "2013"), "the first lies after the last"),
        (("e0", "--from", "14"), "a year has four digits"),
    ],
)
def test_what_cannot_be_printed_is_said_in_a_sentence(
    ebbline: Ebbline, isle: str, words: tuple[str, ...], sentence: str
) -> None:
    collection = () if "--collection" in words else ("--collection", "isle")
    said = ebbline("figure", *words, *collection)
    assert said.code == 2
    assert sentence in said.err
    assert said.out == ""


def test_whoever_stops_reading_or_waiting_gets_no_traceback(isle: str) -> None:
    """In a process of its own, since it ends with its standard output gone."""
    words = [sys.executable, "-m", "server", "figure", "e0", "--collection", "isle"]
    reading, writing = os.pipe()
    os.close(reading)
    surroundings = os.environ | {"EBBLINE_DATABASE_URL": isle}
    with subprocess.Popen(
        words, cwd=ROOT, env=surroundings, stdout=writing, stderr=subprocess.PIPE
    ) as running:
        os.close(writing)
        _out, said = running.communicate()
    assert (running.returncode, said) == (141, b"")


def test_an_interruption_is_no_fault(
    ebbline: Ebbline, isle: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    def interrupted(*_asked: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr("server.cli.figure.series", interrupted)
    said = ebbline("figure", "e0", "--collection", "isle")
    assert (said.code, said.out, said.err) == (130, "", "")


def test_rates_ratios_and_years_added_up_are_printed(ebbline: Ebbline, sqlite_url: str) -> None:
    engine = make_engine(sqlite_url)
    north = {
        year: replace(gompertz_panel(seed=year, people=1e6), births=np.array([9e3, 40.0, 15.0]))
        for year in range(2010, 2015)
    }
    panels = {f"north.f.{year}": panel for year, panel in north.items()}
    panels |= {f"south.f.{year}": gompertz_panel(seed=90 + year) for year in north}
    with sessions(engine)() as session:
        edition(session, panels, parents={"north": "isle", "south": "isle"})
    engine.dispose()
    said = ebbline(
        *("figure", "asr_esp2013", "imr", "smr", "--collection", "isle", "--area", "north"),
        *("--sex", "f", "--settings", "almanac-1-3-years", "--as", "json"),
    )
    assert (said.code, said.err) == (0, "")
    rows = json.loads(said.out)["figures"]["figures"]["rows"]
    assert [(row["indicator"], row["year"]) for row in rows] == [
        (key, year) for key in ("asr_esp2013", "imr", "smr") for year in ("2012", "2013", "2014")
    ]
    for row in rows:
        assert row["value_low"] < row["value"] < row["value_high"]
    deaths = sum(north[year].deaths[0] for year in (2012, 2013, 2014))
    assert rows[5]["value"] == pytest.approx(1000 * deaths / 27e3)
    assert {row["unit"] for row in rows[6:]} == {"ratio"}
    whole = ebbline("figure", "smr", "--collection", "isle", "--settings", "almanac-1-3-years")
    assert "part of no larger one" in whole.out
    assert whole.code == 0
