"""Estimates by key, and the codes that simulations go by."""

from dataclasses import replace

from engine import indicators
from engine.settings import find
from server.results.estimating import differences, estimates, stream
from server.results.questions import PopulationYear
from tests.factories import gompertz_panel

PLAIN = find("almanac-1")
HERE, THERE = (PopulationYear("north", "f", year) for year in ("2014", "2013"))


def test_draws_go_by_collection_area_sex_and_year() -> None:
    # a change here changes every simulated interval that a pinned address shows
    assert str(stream("isle", HERE)) == "isle/north.f.2014"


def test_keys_are_read_together_in_the_order_asked_for() -> None:
    this, that = gompertz_panel(seed=1), gompertz_panel(seed=2, level=3e-5)
    keys, codes = ("median", "e80", "H"), (stream("isle", HERE), stream("isle", THERE))
    here = estimates(keys, this, PLAIN, codes[0])
    less = differences(keys, this, that, PLAIN, codes, shared=replace(that, deaths=that.deaths * 0))
    assert tuple(here) == tuple(less) == keys
    for key in keys:
        one = indicators.find(key)
        alone = indicators.estimate(one, this, PLAIN, streams=codes[0])
        assert (here[key].value, here[key].low) == (alone.value, alone.low)
        alone = indicators.difference(one, this, that, PLAIN, streams=codes)
        assert (less[key].value, less[key].low) == (alone.value, alone.low)
