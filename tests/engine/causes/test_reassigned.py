"""Deaths given to other causes: the sum of every age stays, and nothing is given from nowhere."""

from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays
from numpy.testing import assert_allclose, assert_array_equal

from engine.ages import Array
from engine.causes.reassigned import comparable, completed, spread

COUNTS = arrays(float, (3, 4, 5), elements=st.integers(0, 40).map(float))
FLAGS = arrays(bool, (3, 4))
RATIOS = arrays(float, (3, 4), elements=st.floats(0.2, 5.0) | st.just(np.nan))


@given(COUNTS, arrays(float, (3, 5), elements=st.integers(0, 9).map(float)))
def test_what_causes_lack_is_of_no_stated_cause(deaths: Array, lacking: Array) -> None:
    total = deaths.sum(axis=-2) + lacking
    found = completed(deaths, total)
    assert_array_equal(found[..., :-1, :], deaths)
    assert_array_equal(found[..., -1, :], lacking)


@given(COUNTS, st.floats(-4e-4, 4e-4))
def test_the_rounding_of_shares_is_shared_among_the_causes(deaths: Array, off: float) -> None:
    total = np.maximum(deaths.sum(axis=-2) + off, 0.0)
    found = completed(deaths, total)
    assert_allclose(found.sum(axis=-2), total, rtol=1e-13)
    assert (found[..., -1, :] <= np.where(deaths.sum(axis=-2) > 0, 0.0, 4e-4)).all()


def test_causes_that_exceed_all_deaths_are_brought_down_to_them() -> None:
    found = completed(np.array([[6.0, 1.0], [4.0, 0.0]]), np.array([5.0, 3.0]))
    assert_allclose(found, [[3.0, 1.0], [2.0, 0.0], [0.0, 2.0]])


def test_an_age_without_a_number_has_none_in_any_cause() -> None:
    found = completed(np.array([[1.0, np.nan], [2.0, 3.0]]), np.array([np.nan, 3.0]))
    assert np.isnan(found[:, 0]).all()
    assert_array_equal(found[:, 1], [0.0, 3.0, 0.0])


@given(COUNTS, FLAGS, FLAGS)
def test_spreading_moves_deaths_and_makes_none(deaths: Array, source: Any, over: Any) -> None:
    source = source & ~over
    found = spread(deaths, source, over)
    assert_allclose(found.sum(axis=-2), deaths.sum(axis=-2), rtol=1e-13)
    others = ~(source | over)
    assert_array_equal(found[others], deaths[others])
    taking = np.where(over[..., None], deaths, 0.0).sum(axis=-2)
    left = np.where(source[..., None], found, 0.0).sum(axis=-2)
    assert (left[taking > 0] == 0).all()
    stays = np.broadcast_to((taking == 0)[:, None, :], deaths.shape)
    assert_array_equal(found[stays], deaths[stays])


@given(COUNTS, FLAGS, FLAGS)
def test_spread_deaths_leave_the_shares_of_those_that_take_them(
    deaths: Array, source: Any, over: Any
) -> None:
    over = over | np.array([True, True, False, False])
    found = spread(deaths, source & ~over, over)
    one, two = (found[..., at, :] * deaths[..., 1 - at, :] for at in (0, 1))
    assert_allclose(one, two, rtol=1e-12)


@given(COUNTS, RATIOS)
def test_a_later_coding_counts_the_same_deaths(deaths: Array, ratios: Array) -> None:
    found = comparable(deaths, ratios)
    assert (found >= 0).all()
    assert_allclose(found.sum(axis=-2), deaths.sum(axis=-2), rtol=1e-12)


@given(COUNTS, RATIOS)
def test_stated_ratios_hold_where_the_other_causes_can_give_or_take(
    deaths: Array, ratios: Array
) -> None:
    stated = np.isfinite(ratios)[..., None]
    wanted = np.where(stated, deaths * np.nan_to_num(ratios)[..., None], 0.0)
    total = deaths.sum(axis=-2, keepdims=True)
    others = np.where(stated, 0.0, deaths).sum(axis=-2, keepdims=True)
    room = (others > 0) & (wanted.sum(axis=-2, keepdims=True) <= total) & stated
    found = comparable(deaths, ratios)
    assert_allclose(found[room], wanted[room], rtol=1e-12)


@given(COUNTS, RATIOS, FLAGS)
def test_a_batch_is_its_rows_one_by_one(deaths: Array, ratios: Array, source: Any) -> None:
    total = deaths.sum(axis=-2) + 1
    for row in range(3):
        assert_array_equal(comparable(deaths, ratios)[row], comparable(deaths[row], ratios[row]))
        assert_array_equal(
            spread(deaths, source, ~source)[row], spread(deaths[row], source[row], ~source[row])
        )
        assert_array_equal(completed(deaths, total)[row], completed(deaths[row], total[row]))


def test_without_a_ratio_no_bit_changes() -> None:
    deaths = np.random.default_rng(2).gamma(2.0, 3.0, (4, 6, 20))
    assert_array_equal(comparable(deaths, np.full((4, 6), np.nan)), deaths)


@pytest.mark.parametrize("ratio", [0.5, 3.0])
def test_causes_with_ratios_alone_share_all_deaths(ratio: float) -> None:
    found = comparable(np.array([[30.0], [10.0]]), np.array([ratio, 1.0]))
    weight = np.array([30 * ratio, 10.0])
    assert_allclose(found[:, 0], 40 * weight / weight.sum())
