"""Ticks at round numbers."""

import math
from itertools import pairwise

import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from server.charts.scales import log_ticks, ratio_ticks, ticks


@given(st.floats(-1e4, 1e4), st.floats(1e-3, 1e5), st.integers(3, 8))
def test_ticks_are_few_evenly_spaced_and_inside(low: float, length: float, most: int) -> None:
    high = low + length
    found = ticks(low, high, most)
    assert 0 < len(found) <= most
    slack = 1e-6 * length
    assert all(low - slack <= at <= high + slack for at in found)
    steps = [after - before for before, after in pairwise(found)]
    assert all(math.isclose(step, steps[0], rel_tol=1e-6) for step in steps)


@given(st.floats(1e-4, 10), st.floats(10, 1e4))
def test_powers_of_ten_inside(low: float, high: float) -> None:
    assume(high > 10 * low)
    found = log_ticks(low, high)
    assert found
    assert all(low * (1 - 1e-6) <= at <= high * (1 + 1e-6) for at in found)


@given(st.floats(0.05, 0.99), st.floats(1.01, 12))
def test_ratios_are_few_with_one_among_them_and_stand_apart(low: float, high: float) -> None:
    found = ratio_ticks(low, high)
    assert found.count(1.0) == 1
    assert len(found) <= 5
    assert all(low <= at <= high for at in found)
    steps = [after / before for before, after in pairwise(found)]
    assert all(step >= (high / low) ** (1 / 6) * (1 - 1e-9) for step in steps)


def test_a_scale_needs_length() -> None:
    with pytest.raises(ValueError, match="has no length"):
        ticks(1, 1)
