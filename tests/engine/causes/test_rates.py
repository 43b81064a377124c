"""Rates by cause: the indicators' own, which add up, and shares of deaths."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal
from scipy.stats import beta, chi2

from engine.causes.counts import CauseCounts
from engine.causes.rates import cause_panel, deaths_and_shares, rates_by_cause
from engine.estimates import Reason
from engine.indicators import estimates, find
from engine.settings import SETTINGS
from tests.factories import GRIDS, complete, gompertz_panel, parted

pytestmark = pytest.mark.fast
PLAIN = SETTINGS["almanac-1"]
RATES = [
    find(key)
    for key in ("cdr", "asr_esp2013", "asr75_esp2013", "yll75", "yll_ref", "asr_by_isle.p.2010")
]


@pytest.mark.parametrize("settings", ["almanac-1", "almanac-1-smooth", "almanac-1-gompertz"])
def test_rates_of_the_causes_add_up_to_that_of_all(settings: str) -> None:
    panel = complete(gompertz_panel(seed=6, slope=np.array([0.09, 0.1])))
    found = rates_by_cause(RATES, panel, parted(panel), SETTINGS[settings])
    whole = estimates(RATES, panel, SETTINGS[settings])
    for one in RATES:
        assert found[one.key].value.shape == (2, 3)
        assert_allclose(found[one.key].value.sum(axis=-1), whole[one.key].value, rtol=1e-12)


def test_each_is_that_of_a_population_in_which_nobody_died_of_anything_else() -> None:
    panel = gompertz_panel(seed=6, slope=np.array([0.09, 0.1]))
    causes = parted(panel)
    found = rates_by_cause(RATES[:5], panel, causes, PLAIN)
    for cause in range(3):
        alone = estimates(RATES[:5], replace(panel, deaths=causes.deaths[..., cause, :]), PLAIN)
        for key, expected in alone.items():
            for name in ("value", "low", "high", "se"):
                got = getattr(found[key], name)[..., cause]
                assert_array_equal(got, getattr(expected, name), f"{key} {name}")


def test_before_75_only_those_deaths_and_years_count() -> None:
    panel = gompertz_panel(seed=6)
    older = np.array(panel.grid.starts) >= 75
    more = replace(panel, deaths=np.where(older, 3 * panel.deaths, panel.deaths))
    one = find("asr75_esp2013")
    assert_array_equal(
        estimates([one], more, PLAIN)[one.key].value, estimates([one], panel, PLAIN)[one.key].value
    )
    steady = replace(panel, deaths=np.where(older, panel.deaths, 0.003 * panel.exposure))
    assert estimates([one], steady, PLAIN)[one.key].value == pytest.approx(0.003, rel=1e-12)
    few = replace(panel, deaths=np.where(older, panel.deaths, 0.0))
    assert estimates([one], few, PLAIN)[one.key].reason == Reason.TOO_FEW_DEATHS
    with pytest.raises(ValueError, match="no age group of the European Standard"):
        find("asr72_esp2013")


def test_few_deaths_give_no_standardised_rate_and_none_give_a_crude_one_of_nought() -> None:
    panel = gompertz_panel(seed=6)
    few = np.zeros_like(panel.deaths)
    few[12] = 9.0
    causes = CauseCounts(np.stack([few, panel.deaths - few]))
    found = rates_by_cause(RATES[:2], panel, causes, PLAIN)
    assert found["asr_esp2013"].reason[0] == Reason.TOO_FEW_DEATHS
    low, high = chi2.ppf(0.025, 18) / 2, chi2.ppf(0.975, 20) / 2
    years = panel.exposure.sum()
    assert_allclose(found["cdr"].low[0] * years, low, rtol=1e-9)
    assert_allclose(found["cdr"].high[0] * years, high, rtol=1e-9)


def test_shares_add_up_and_have_limits_near_those_of_a_binomial_law() -> None:
    """Given all deaths, those of a cause are a binomial count."""
    panel = gompertz_panel(seed=6, people=100_000)
    causes = parted(panel)
    found = deaths_and_shares(causes, PLAIN)
    assert_allclose(found.share.value.sum(), 1, rtol=1e-12)
    assert_array_equal(found.deaths, causes.deaths.sum(axis=-1))
    total, own = found.deaths.sum(), found.deaths
    low, high = beta.ppf(0.025, own, total - own + 1), beta.ppf(0.975, own + 1, total - own)
    assert_allclose(found.share.low, low, atol=0.003)
    assert_allclose(found.share.high, high, atol=0.003)
    p = found.share.value
    assert_allclose(found.share.se, np.sqrt(p * (1 - p) / total), rtol=1e-9)


def test_a_cause_counts_by_what_was_counted_of_it() -> None:
    panel = gompertz_panel(GRIDS["irregular"], seed=6)
    causes = parted(panel)
    halved = CauseCounts(causes.deaths, causes.deaths / 2)
    for found, plain in (
        (
            rates_by_cause(RATES[:2], panel, halved, PLAIN)[key],
            rates_by_cause(RATES[:2], panel, causes, PLAIN)[key],
        )
        for key in ("cdr", "asr_esp2013")
    ):
        assert_allclose(found.se, np.sqrt(2) * plain.se, rtol=1e-12)
    share = deaths_and_shares(halved, PLAIN).share
    assert_allclose(share.se, np.sqrt(2) * deaths_and_shares(causes, PLAIN).share.se, rtol=1e-12)
    assert cause_panel(panel, halved).counted is halved.counted


def test_what_is_no_rate_is_refused() -> None:
    panel = gompertz_panel(seed=6)
    for key in ("e0", "smr"):
        with pytest.raises(ValueError, match="is not a rate of deaths"):
            rates_by_cause([find(key)], panel, parted(panel), PLAIN)
