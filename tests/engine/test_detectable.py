"""The smallest change against its power by simulation and by R; the years that would show one."""

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal
from scipy.stats import norm

from engine.detectable import pooled_years, smallest_change
from engine.indicators import INDICATORS, difference
from engine.panel import Panel
from engine.settings import find
from tests.factories import gompertz_panel

PLAIN = find("almanac-1")


@pytest.mark.parametrize(
    ("level", "power", "times"),
    [
        # R 4: power.t.test(n = 1e6, sd = 1, power = .8, tol = 1e-14)$delta * sqrt(1e6 / 2)
        (0.95, 0.8, 2.80158656338706),
        # R 4: power.t.test(n = 1e6, sd = 1, power = .9, sig.level = .1, tol = 1e-14)$delta
        #      * sqrt(1e6 / 2)
        (0.90, 0.9, 2.9264061821872),
    ],
)
def test_standard_errors_to_the_smallest_change_as_r_has_them(level, power, times) -> None:
    assert smallest_change(np.array(1.0), level, power=power) == pytest.approx(times, rel=2e-6)


@pytest.mark.parametrize(("level", "power"), [(0.95, 0.8), (0.9, 0.8), (0.99, 0.5), (0.95, 0.9)])
def test_a_true_change_of_that_size_is_seen_with_the_stated_chance(level, power) -> None:
    se = np.array([0.02, 3.0])
    change, half = smallest_change(se, level, power=power), norm.ppf((1 + level) / 2) * se
    seen = norm.sf(half, change, se) + norm.cdf(-half, change, se)
    assert_allclose(seen, power, atol=0.006)  # the far side, where power is low, adds a little


def test_pooled_years_bring_the_smallest_change_down_to_the_one_found() -> None:
    rng = np.random.default_rng(1)
    change, se = rng.normal(size=200), rng.uniform(0.05, 2, 200)
    years = pooled_years(change, se, 0.95)
    assert_array_equal(years, np.round(years))
    assert np.all(smallest_change(se / np.sqrt(years), 0.95) <= np.abs(change))
    fewer = years > 1
    left = smallest_change(se / np.sqrt(np.maximum(years - 1, 1)), 0.95)
    assert np.all(left[fewer] > np.abs(change)[fewer])
    assert np.all(smallest_change(se, 0.95)[~fewer] <= np.abs(change)[~fewer])
    assert 20 < fewer.sum() < 180


def test_nothing_shows_what_is_not_there_or_not_known() -> None:
    change, se = np.array([0.0, 0.0, np.nan, 1.0]), np.array([0.0, 1.0, 1.0, np.nan])
    assert np.isnan(pooled_years(change, se, 0.95)).all()
    assert np.isnan(smallest_change(se, 0.95)[-1])


def test_years_added_up_show_the_change_that_one_year_could_not() -> None:
    """The counts of that many years on each side, at the same rates, see it."""
    one = gompertz_panel(people=30_000), gompertz_panel(people=30_000, level=1.9e-5)
    e0 = INDICATORS["e0"]
    found = difference(e0, one[1], one[0], PLAIN)
    assert found.low < 0 < found.value < smallest_change(found.se, PLAIN.level)
    years = int(pooled_years(found.value, found.se, PLAIN.level))
    assert years > 1
    for count, enough in ((years, True), (years - 1, False)):
        many = [Panel.pooled([panel] * count) for panel in one]
        pooled = difference(e0, many[1], many[0], PLAIN)
        assert (smallest_change(pooled.se, PLAIN.level) <= pooled.value) is np.bool_(enough)


@pytest.mark.parametrize(("level", "power"), [(1.0, 0.8), (0.0, 0.8), (0.95, 1.0), (0.95, 0.3)])
def test_what_is_no_chance_is_refused(level, power) -> None:
    with pytest.raises(ValueError, match="have no smallest change"):
        smallest_change(np.array(1.0), level, power=power)
