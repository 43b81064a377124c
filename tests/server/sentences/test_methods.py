"""How figures are made, in words: every entry of the registries, and of each what is true of it."""

import pytest

from engine.decomposition import NOT_DECOMPOSED
from engine.indicators import INDICATORS, PATTERNS, find
from engine.settings import SETTINGS
from server.sentences import methods as say

EVERY = (*INDICATORS, *(one.example for one in PATTERNS))


@pytest.mark.parametrize("key", EVERY)
def test_every_indicator_has_all_its_facts(key: str) -> None:
    facts = dict(say.indicator(find(key)))
    assert list(facts) == ["Definition", "Formula", "Unit", "Interval", "Needs", "Source"]
    assert all(text.strip() for text in facts.values())


@pytest.mark.parametrize("key", EVERY)
def test_how_an_interval_comes_about_goes_by_the_kind_of_figure(key: str) -> None:
    one = find(key)
    said = say.interval(one)
    assert said.startswith(
        "Exact: a count"
        if one.unit.limits == "count"
        else "Smooth: by the gamma law"
        if one.smooth
        else "Not smooth, so by simulation"
    )
    ways = {
        "mixed": "of the deaths that raise it and of those that lower it",
        "part": "within 0 and the whole",
        "gamma": "exact where every death weighs the same",
    }
    for kind, way in ways.items():
        assert (way in said) == (one.smooth and one.unit.limits == kind)
    if not one.smooth:
        assert one.why_not_smooth in said


@pytest.mark.parametrize("key", EVERY)
def test_shares_of_ages_are_promised_only_where_there_are_any(key: str) -> None:
    one, said = find(key), say.interval(find(key))
    none = one.unit.limits == "count" or key in NOT_DECOMPOSED or one.needs.whole
    assert ("Differences are shared out" in said) == (one.smooth and not none)
    assert ("by replacing the rates one by one" in said) == (not one.smooth and not none)
    assert ("is not shared out over ages" in said) == (key in NOT_DECOMPOSED)
    assert ("Two of them do not compare" in said) == one.needs.whole


def test_needs_name_what_must_be_handed_in() -> None:
    assert "a larger area of which the area is part" in say.needs(INDICATORS["smr"])
    assert "at least 10 deaths" in say.needs(INDICATORS["asr_esp2013"])
    assert "an age group that begins at 65" in say.needs(INDICATORS["e65"])
    assert "live births" in say.needs(INDICATORS["imr"])
    assert "deaths before 28 days" in say.needs(INDICATORS["nmr"])
    assert "stillbirths" in say.needs(INDICATORS["sbr"])
    for key, one in INDICATORS.items():
        assert ("births" in say.needs(one)) == bool(one.needs.births), key
        assert ("larger area" in say.needs(one)) == one.needs.whole, key


@pytest.mark.parametrize("key", SETTINGS)
def test_every_chain_tells_its_stages_and_its_limits(key: str) -> None:
    one = SETTINGS[key]
    facts = say.settings(one)
    assert len(facts) == len(one.stages) + 1
    word, limits = facts[-1]
    assert word == "Limits"
    assert "No figure below 5,000 person-years, a caution below 20,000" in limits
    assert "5 %" in limits
    assert "95 %" in limits
