"""Limits from simulated tables: ranks, blocks, and the level they hold."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal
from scipy.special import ndtr

from engine.estimates import Reason
from engine.indicators import INDICATORS, estimate
from engine.settings import SETTINGS
from engine.simulation import corrected, drawn, quantiles, spread, widest
from tests.factories import GRIDS, codes, gompertz_panel

TAILS = np.array([[0.025], [0.975]])
SETTINGS_1 = SETTINGS["almanac-1"]
E0, MODE, MEDIAN = INDICATORS["e0"], INDICATORS["mode"], INDICATORS["median"]


def test_simulated_limits_do_not_depend_on_how_they_are_cut_into_blocks() -> None:
    slopes = np.linspace(0.09, 0.11, 9)
    panel = gompertz_panel(seed=1, slope=slopes, level=0.1 / np.exp(86 * slopes))
    many = replace(SETTINGS_1, draws=900)  # two populations to a block
    together = estimate(MEDIAN, panel, many, streams=codes(panel))
    alone = [estimate(MEDIAN, panel[i], many, streams=codes(panel)[i]) for i in range(9)]
    assert_array_equal(together.low, [one.low for one in alone])


def test_limits_are_quantiles_by_rank_and_stand_if_few_draws_fail() -> None:
    rng = np.random.default_rng(0)
    values = rng.normal(size=(400, 4))
    values[:4, 1], values[:5, 2], values[:, 3] = np.nan, np.nan, np.nan
    got = quantiles(values, TAILS)
    for column in (0, 1):
        known = values[~np.isnan(values[:, column]), column]
        expected = np.quantile(known, [0.025, 0.975], method="weibull")
        assert_allclose(got[:, column], expected, rtol=1e-12)
    assert np.isnan(got[:, 2:]).all()  # five in four hundred are too many


@pytest.mark.parametrize("draws", [40, 400])
def test_a_further_draw_falls_within_the_limits_as_often_as_the_level_says(draws: int) -> None:
    values = np.random.default_rng(1).normal(size=(draws, 20_000))
    low, high = quantiles(values, TAILS)
    assert np.mean(ndtr(high) - ndtr(low)) == pytest.approx(0.95, abs=0.001)


def test_where_the_peak_is_often_lost_the_value_stands_without_an_interval() -> None:
    # people so long-lived that the peak is just below the open age
    grid = GRIDS["abridged"]
    panel = gompertz_panel(grid, level=0.1 / np.exp(99.7 * 0.1), people=200_000, accidents=0)
    modelled = SETTINGS["almanac-1-gompertz"]
    got = estimate(MODE, panel, modelled, streams=codes(panel))
    assert 95 < got.value < 100
    assert np.isnan(got.low)
    assert got.reason == Reason.OFTEN_LOST


def test_the_spread_of_draws_leaves_out_those_that_lack_the_number() -> None:
    values = np.random.default_rng(2).normal(size=(50, 3))
    values[:7, 1] = np.nan
    expected = [values[:, 0].std(ddof=1), values[7:, 1].std(ddof=1), values[:, 2].std(ddof=1)]
    assert_allclose(spread(values), expected, rtol=1e-12)
    got = estimate(MEDIAN, gompertz_panel(seed=1), SETTINGS_1, streams=np.array("isle"))
    assert got.se == pytest.approx((got.high - got.low) / (2 * 1.96), rel=0.15)


def test_an_error_of_the_population_moves_all_ages_of_a_table_alike() -> None:
    """By a factor of its own for each table, the same for every number read off it."""
    counted = replace(SETTINGS_1, population_error=((0, 3.0),))
    panel = gompertz_panel(people=1e5)[None]
    deaths = np.broadcast_to(panel.deaths, (500, *panel.deaths.shape))
    rate = INDICATORS["cdr"]
    values = drawn([rate, E0], panel, deaths, counted, np.array(["isle"]))
    logs = np.log(values["cdr"][:, 0])
    assert logs.std() == pytest.approx(0.03, rel=0.1)
    assert np.corrcoef(logs, values["e0"][:, 0])[0, 1] < -0.999
    other = drawn([rate], panel, deaths, counted, np.array(["cape"]))["cdr"][:, 0]
    assert abs(np.corrcoef(logs, other)[0, 1]) < 0.15
    none = drawn([rate], panel, deaths, SETTINGS_1, np.array(["isle"]))["cdr"]
    assert np.ptp(none) == 0


def test_draws_about_the_value_leave_their_own_percentiles() -> None:
    values = np.linspace(-1, 1, 399)[:, None] ** 3
    assert_allclose(corrected(values, np.zeros(1), 0.95), quantiles(values, TAILS), rtol=1e-9)


def test_a_bias_of_the_draws_is_taken_to_be_that_of_the_value() -> None:
    """Exact where value and draws are off by as much on some scale: here exp of a normal number
    that is drawn 0.4 too low. The limits are then those of the unbiased number."""
    rng = np.random.default_rng(5)
    truth, bias = 1.3, -0.4
    observed = truth + bias + rng.normal(size=4000)
    values = np.exp(observed + bias + rng.normal(size=(999, 4000)))
    low, high = corrected(values, np.exp(observed), 0.9)
    assert np.mean(low > np.exp(truth)) == pytest.approx(0.05, abs=0.012)
    assert np.mean(high < np.exp(truth)) == pytest.approx(0.05, abs=0.012)
    plain = quantiles(values, np.array([[0.05], [0.95]]))
    assert np.mean(plain[1] < np.exp(truth)) > 0.15


def test_draws_equal_to_the_value_count_half() -> None:
    values = np.repeat([80.0, 85.0, 90.0], [100, 200, 100])[:, None]
    assert_array_equal(corrected(values, np.array([85.0]), 0.5)[:, 0], [81.25, 88.75])


def test_the_wider_limit_of_each_side_is_taken_and_the_value_is_held() -> None:
    values = np.random.default_rng(6).normal(size=(400, 1))
    plain = quantiles(values, TAILS)
    for observed in np.array([[-0.7], [0.0], [0.7]]):
        other, both = corrected(values, observed, 0.95), widest(values, observed, 0.95)
        assert_array_equal(both[0], np.minimum(plain[0], other[0]))
        assert_array_equal(both[1], np.maximum(plain[1], other[1]))
    for observed in np.array([[-9.0], [9.0]]):
        low, high = widest(values, observed, 0.95)
        assert low <= observed <= high
    lost = np.where(np.arange(400)[:, None] < 5, np.nan, values)
    assert np.isnan(widest(lost, np.zeros(1), 0.95)).all()
    assert np.isnan(widest(values, np.array([np.nan]), 0.95)).all()
