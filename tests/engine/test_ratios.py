"""Ratios of death rates: exact limits, one people on both sides, and what is missing."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.stats import binomtest, norm

from engine.ages import AgeGrid
from engine.panel import Panel
from engine.ratios import rate_ratios
from engine.settings import Settings, find
from tests.factories import gompertz_panel

PLAIN = find("almanac-1")
ONE = AgeGrid((0,))


def of(deaths: float, exposure: float) -> Panel:
    return Panel.of(ONE, np.array([float(deaths)]), np.array([float(exposure)]), sex="f")


@pytest.mark.parametrize(("here", "there"), [(30, 50), (1, 4), (400, 380), (0, 7)])
def test_limits_are_the_exact_ones_of_a_share(here: int, there: int) -> None:
    found = rate_ratios(of(here, 1000), of(there, 2500), PLAIN)
    share = binomtest(here, here + there).proportion_ci(0.95, method="exact")
    for end, limit in ((found.low, share.low), (found.high, share.high)):
        assert_allclose(end, [limit / (1 - limit) * 2.5])
    assert_allclose(found.value, [here / there * 2.5])


def test_with_many_deaths_they_are_those_of_the_logarithm() -> None:
    found = rate_ratios(of(40_000, 1e6), of(50_000, 1e6), PLAIN)
    far = norm.ppf(0.975) * np.sqrt(1 / 40_000 + 1 / 50_000)
    assert_allclose([found.low[0], found.high[0]], 0.8 * np.exp([-far, far]), rtol=1e-4)


def test_an_area_in_its_whole_counts_its_deaths_once() -> None:
    """Drawn: the part is Poisson, the rest is Poisson, the whole is their sum."""
    rng = np.random.default_rng(4)
    part, rest = rng.poisson(400, 4000).astype(float), rng.poisson(600, 4000).astype(float)
    this = Panel.of(ONE, part[:, None], np.full((4000, 1), 1e5), sex="m")
    that = Panel.of(ONE, (part + rest)[:, None], np.full((4000, 1), 2e5), sex="m")
    found = rate_ratios(this, that, PLAIN, shared=this)
    true = (400 / 1e5) / (1000 / 2e5)
    held = np.mean((found.low < true) & (true < found.high))
    assert 0.935 < held < 0.965
    apart = rate_ratios(this, that, PLAIN)
    assert np.all(apart.high - apart.low > 1.4 * (found.high - found.low))


def test_exchanged_the_ratio_is_its_inverse() -> None:
    this, that = gompertz_panel(seed=1), gompertz_panel(seed=2, level=3e-5)
    there, back = rate_ratios(this, that, PLAIN), rate_ratios(that, this, PLAIN)
    some = (this.deaths > 0) & (that.deaths > 0)
    assert_allclose(there.value[some], 1 / back.value[some])
    assert_allclose(there.low[some], 1 / back.high[some])


def test_without_deaths_or_people() -> None:
    nobody = rate_ratios(of(0, 1000), of(0, 1000), PLAIN)
    assert np.isnan([nobody.value, nobody.low, nobody.high]).all()
    none_here = rate_ratios(of(0, 1000), of(5, 1000), PLAIN)
    assert (none_here.value[0], none_here.low[0]) == (0, 0)
    assert none_here.high[0] > 0
    none_there = rate_ratios(of(5, 1000), of(0, 1000), PLAIN)
    assert np.isnan(none_there.value[0])
    assert none_there.low[0] > 0
    assert np.isnan(rate_ratios(of(0, 0), of(5, 1000), PLAIN).high[0])
    with pytest.raises(ValueError, match="regroup both"):
        rate_ratios(of(1, 1), gompertz_panel(), PLAIN)


def test_deaths_shared_out_count_as_those_counted() -> None:
    counted = of(100, 1000)
    doubled = replace(counted, deaths=np.array([200.0]), counted=np.array([100.0]))
    plain, out = (rate_ratios(one, of(80, 900), PLAIN) for one in (counted, doubled))
    for name in ("value", "low", "high"):
        assert_allclose(getattr(out, name), 2 * getattr(plain, name))


def test_an_error_of_the_population_of_both_sides_widens_them() -> None:
    wide = replace_error(2.0)
    plain, out = (rate_ratios(of(1e6, 1e8), of(1e6, 1e8), one) for one in (PLAIN, wide))
    by_chance, by_both = np.log(plain.high / plain.value), np.log(out.high / out.value)
    error = norm.ppf(0.975) * np.sqrt(2) * 0.02
    assert_allclose(by_both, np.hypot(by_chance, error), rtol=1e-9)


def replace_error(percent: float) -> Settings:
    return replace(PLAIN, population_error=((0, percent),))
