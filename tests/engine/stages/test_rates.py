"""Death rates, and groups joined for want of person-years."""

import numpy as np
import pytest

from engine.stages.rates import death_rates


@pytest.mark.fast
def test_a_run_of_empty_groups_is_joined_with_the_one_below() -> None:
    deaths = np.array([[1.0, 2, 3, 4, 5], [1.0, 2, 3, 4, 5]])
    exposure = np.array([[10.0, 20, 0, 0, 50], [10.0, 20, 30, 40, 0]])
    rates = death_rates(deaths, exposure)
    np.testing.assert_allclose(
        rates.mx, [[0.1, 9 / 20, 9 / 20, 9 / 20, 0.1], [0.1, 0.1, 0.1, 9 / 40, 9 / 40]]
    )
    np.testing.assert_array_equal(
        rates.joined, [[False, True, True, True, False], [False, False, False, True, True]]
    )


@pytest.mark.fast
def test_a_death_counts_in_the_rate_of_its_join() -> None:
    rates = death_rates(np.ones(5), np.array([10.0, 20, 0, 0, 50]))
    g = rates.pull(np.array([1.0, 2, 4, 8, 16]))
    np.testing.assert_allclose(rates.per_death(g), [0.1, 14 / 20, 14 / 20, 14 / 20, 16 / 50])


@pytest.mark.fast
def test_the_pullback_gathers_a_join_in_its_lowest_group() -> None:
    rates = death_rates(np.ones(5), np.array([10.0, 20, 0, 0, 50]))
    np.testing.assert_array_equal(rates.pull(np.array([1.0, 2, 4, 8, 16])), [1, 14, 0, 0, 16])


@pytest.mark.fast
def test_age_0_has_no_neighbour_below() -> None:
    rates = death_rates(np.array([3.0, 1, 1]), np.array([0.0, 0, 10]))
    np.testing.assert_array_equal(rates.mx, [np.nan, np.nan, 0.1])
    assert not rates.joined.any()


@pytest.mark.fast
def test_missing_counts_are_not_empty_groups() -> None:
    rates = death_rates(np.array([3.0, np.nan, 1]), np.array([10.0, 10, np.nan]))
    np.testing.assert_array_equal(rates.mx, [0.3, np.nan, np.nan])
    assert not rates.joined.any()
