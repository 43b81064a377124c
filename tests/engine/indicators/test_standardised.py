"""Standardised rates as entries: what they need, say and name."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from engine.chain import Chain, gradient, run
from engine.estimates import Reason
from engine.indicator import Indicator
from engine.indicators import estimate
from engine.indicators.rates import FAMILY as RATES
from engine.indicators.standardised import FAMILY, by_population, by_standard
from engine.panel import Panel
from engine.settings import SETTINGS
from engine.standardisation import few_deaths
from engine.standards import STANDARDS, Standard
from tests.factories import GRIDS, gompertz_panel

ENTRIES = {indicator.key: indicator for indicator in FAMILY}
ISLE = by_population("isle.p.2010")


def beside(whole: Panel | None = None, standard: Panel | None = None) -> Chain:
    panel = gompertz_panel(GRIDS["abridged"], seed=5, slope=np.array([0.09, 0.1]))
    return run(replace(panel, whole=whole, standard=standard), SETTINGS["almanac-1"])


def other() -> Panel:
    return gompertz_panel(GRIDS["abridged"], seed=6, slope=np.array([0.085, 0.095]), people=3e6)


def test_the_keys() -> None:
    assert list(ENTRIES) == [
        "asr_esp2013", "asr_esp1976", "asr_who2000", "asr_segi", "asr_us2000", "smr", "isr",
    ]  # fmt: skip


@pytest.mark.parametrize("standard", STANDARDS.values(), ids=lambda s: s.key)
def test_a_rate_says_its_standard_what_is_odd_with_it_and_from_how_many_deaths(
    standard: Standard,
) -> None:
    entry = by_standard(standard)
    assert standard.label in entry.label
    assert standard.label in entry.definition
    assert standard.note in entry.definition
    assert standard.source in entry.source
    assert entry.needs.least_deaths == 10
    assert entry.unit.limits == "gamma"


def test_by_the_people_of_a_population_year() -> None:
    people = other()
    chain = beside(standard=people)
    mx, weights = chain.rates.mx, people.exposure
    by_hand = [sum(m * w) / sum(w) for m, w in zip(mx, weights, strict=True)]
    assert_allclose(ISLE.value(chain), by_hand, rtol=1e-12)
    own = replace(chain.panel, standard=chain.panel)
    assert_allclose(ISLE.value(run(own, chain.settings)), RATES[0].value(chain), rtol=1e-12)
    assert ISLE.needs.standard == "isle.p.2010"
    assert ISLE.needs.least_deaths == 10
    assert ISLE.key == "asr_by_isle.p.2010"


def test_a_ratio_and_a_rate_against_the_whole() -> None:
    whole = other()
    chain = beside(whole=whole)
    expected = (whole.deaths / whole.exposure * chain.panel.exposure).sum(axis=-1)
    ratio = chain.panel.deaths.sum(axis=-1) / expected
    crude = whole.deaths.sum(axis=-1) / whole.exposure.sum(axis=-1)
    assert_allclose(ENTRIES["smr"].value(chain), ratio, rtol=1e-12)
    assert_allclose(ENTRIES["isr"].value(chain), ratio * crude, rtol=1e-12)
    for key, scale in (("smr", 1.0), ("isr", crude)):
        each = chain.rates.per_death(gradient(ENTRIES[key], chain))
        assert_allclose(each, np.broadcast_to((scale / expected)[:, None], each.shape), rtol=1e-12)


@pytest.mark.parametrize("entry", [ENTRIES["smr"], ENTRIES["isr"], ISLE], ids=lambda i: i.key)
def test_without_what_it_is_set_against_there_is_no_number(entry: Indicator) -> None:
    assert np.isnan(entry.value(beside())).all()
    holed = other().over(lambda array: np.where([[True], [False]], np.nan, array))
    chain = beside(whole=holed, standard=holed)
    assert np.isnan(entry.value(chain)).tolist() == [True, False]
    assert entry.needs.otherwise in (Reason.NO_WHOLE, Reason.NO_STANDARD)


@pytest.mark.parametrize("key", ["smr", "isr"])
def test_two_ratios_are_said_not_to_compare(key: str) -> None:
    assert "do not compare with one another" in ENTRIES[key].definition
    assert ENTRIES[key].needs.whole


def test_a_ratio_of_one_is_as_many_as_expected() -> None:
    unit = ENTRIES["smr"].unit
    assert (unit.scale, unit.decimals, unit.limits) == (1, 2, "gamma")


@pytest.mark.parametrize("entry", [ENTRIES["asr_esp2013"], ISLE], ids=lambda i: i.key)
def test_under_ten_deaths_there_is_no_rate_and_under_twenty_it_is_flagged(entry: Indicator) -> None:
    totals = np.array([9.0, 10, 19, 20])
    panel = gompertz_panel(GRIDS["abridged"], slope=np.full(4, 0.1))
    deaths = np.where(np.array(panel.grid.starts) == 70, totals[:, None], 0.0)
    got = estimate(entry, replace(panel, deaths=deaths, standard=panel), SETTINGS["almanac-1"])
    assert np.isnan(got.value).tolist() == [True, False, False, False]
    assert got.reason.tolist() == [Reason.TOO_FEW_DEATHS, 0, 0, 0]
    assert few_deaths(entry, deaths).tolist() == [False, True, True, False]
