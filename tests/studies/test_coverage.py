"""The study of coverage in short: smooth numbers in small populations, and how it is told."""

import json
from dataclasses import replace

import numpy as np
import pytest

from engine.chance import cautious, told
from engine.indicators import INDICATORS
from engine.settings import find
from engine.streams import generator
from tests.factories import GRIDS
from tests.studies import coverage
from tests.studies.coverage import Coverage, measure, replicated, table, truth

PLAIN = find("almanac-2")
TOLD = [one for one in INDICATORS.values() if told(one)]


@pytest.mark.parametrize(("ages", "persons"), [("abridged", 20_000), ("single", 200_000)])
def test_intervals_hold_the_truth_as_often_as_they_say(ages: str, persons: int) -> None:
    """Of 600 replicates each, so that the share is sure to about 1.8 %."""
    for found in measure(TOLD, ages, persons, "poisson", 600, PLAIN):
        wide = cautious(INDICATORS[found.indicator], np.array(persons))
        assert 0.925 < found.covered <= (1 if wide else 0.982), found
        assert found.without < 0.03
        assert abs(found.bias) < 0.4
        assert found.replicates == 600


def test_overdispersed_deaths_are_held_as_seldom_as_their_variance_says() -> None:
    few = [INDICATORS[key] for key in ("e0", "45q15", "cdr", "H")]
    for found in measure(few, "abridged", 400_000, "overdispersed", 1200, PLAIN):
        assert found.covered == pytest.approx(0.890, abs=0.03)  # 2 Phi(1.96 / sqrt(1.5)) - 1


def test_simulated_intervals_hold_the_truth() -> None:
    some = [INDICATORS[key] for key in ("median", "shortest_half")]
    for found in measure(some, "abridged", 50_000, "poisson", 120, replace(PLAIN, draws=200)):
        assert 0.87 < found.covered < 0.995
        assert not found.smooth


@pytest.mark.parametrize("law", coverage.LAWS)
def test_replicates_have_the_mean_and_the_variance_of_their_law(law: str) -> None:
    mean = truth(GRIDS["abridged"], 1e6)
    drawn = replicated(mean, 4000, law, generator("test", law))
    spread = drawn.deaths.var(axis=0) / mean.deaths
    np.testing.assert_allclose(drawn.deaths.mean(axis=0), mean.deaths, rtol=0.03)
    np.testing.assert_allclose(spread, coverage.LAWS[law], rtol=0.12)
    early = drawn.births[:, 2]
    assert np.all(early <= drawn.deaths[:, 0])
    assert early.mean() == pytest.approx(coverage.NEONATAL * mean.deaths[0], rel=0.02)
    assert np.all(drawn.births[:, 0] == mean.births[0])


def test_a_table_tells_tails_that_differ_and_what_has_no_interval() -> None:
    def row(persons: int, ages: str, **changed: float) -> Coverage:
        even = Coverage("e0", True, ages, persons, "poisson", 100, 0.0, 0.95, 0.02, 0.03, 0.0)
        return replace(even, **changed)

    found = [
        row(20_000, "single", covered=0.9, above=0.02, below=0.08),
        row(20_000, "abridged", without=0.31),
        row(5_000, "abridged", covered=np.nan, without=1.0),
    ]
    assert table(found, "poisson").splitlines() == [
        "| indicator | 5,000 | 20,000 |",
        "| --- | --- | --- |",
        "| e0 | none | 95.0 -31; 90.0 (2 8) |",
    ]


def test_the_command_adds_to_its_file_and_writes_its_report(tmp_path, monkeypatch, capsys) -> None:
    to, report = tmp_path / "found.json", tmp_path / "coverage.md"
    words = "coverage --replicates 20 --ages abridged --laws poisson --indicators e0 --to"
    for size in ("20000", "50000", "20000"):
        command = [*words.split(), str(to), "--report", str(report), "--sizes", size]
        monkeypatch.setattr("sys.argv", command)
        coverage.main()
    assert [row["persons"] for row in json.loads(to.read_text())] == [50_000, 20_000]
    assert "| indicator | 20,000 | 50,000 |" in report.read_text()
    assert report.read_text().startswith("# How often intervals hold the truth\n\nBy `python -m")
    assert "abridged, poisson, 20,000:" in capsys.readouterr().out
