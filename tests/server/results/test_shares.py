"""Parts of a difference: laws that hold whatever the value is, and the two closed cases."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from server.results.shares import State, shares, states

NAMES = "abcd"


@st.composite
def games(draw: st.DrawFn) -> tuple[str, dict[State, float]]:
    parts = NAMES[: draw(st.integers(1, 4))]
    numbers = st.floats(-1e6, 1e6)
    return parts, {state: draw(numbers) for state in states(parts)}


@given(game=games())
def test_they_add_up(game: tuple[str, dict[State, float]]) -> None:
    parts, values = game
    found = shares(values, parts)
    assert found is not None
    whole = values[frozenset(parts)] - values[frozenset()]
    np.testing.assert_allclose(math.fsum(found.amounts.values()), whole, atol=1e-6, rtol=1e-12)
    assert found.orders == found.all_orders == math.factorial(len(parts))


@given(game=games(), turned=st.randoms())
def test_the_order_they_are_named_in_is_no_matter(game, turned) -> None:  # type: ignore[no-untyped-def]
    parts, values = game
    other = list(parts)
    turned.shuffle(other)
    here, there = shares(values, parts), shares(values, other)
    assert here is not None
    assert there is not None
    for part in parts:
        assert here.amounts[part] == pytest.approx(there.amounts[part], abs=1e-6)


@given(first=st.floats(-9, 9), second=st.floats(-9, 9), both=st.floats(-9, 9))
def test_two_parts_take_the_mean_of_both_directions(
    first: float, second: float, both: float
) -> None:
    values = {frozenset(): 0.0, frozenset("a"): first, frozenset("b"): second}
    found = shares(values | {frozenset("ab"): both}, "ab")
    assert found is not None
    assert found.amounts["a"] == pytest.approx((first + (both - second)) / 2, abs=1e-12)


def test_parts_that_act_alike_share_alike_and_one_without_effect_has_none() -> None:
    """Shapley's symmetry and null player, on a value that counts how many of a and b are there."""
    values = {state: float(len(state & {"a", "b"}) ** 2) for state in states("abc")}
    found = shares(values, "abc")
    assert found is not None
    assert found.amounts == {"a": 2.0, "b": 2.0, "c": 0.0}


def test_orders_that_pass_a_gap_are_left_out_and_the_rest_adds_up() -> None:
    values = {state: float(len(state)) + 3.0 * ("a" in state) for state in states("abc")}
    values[frozenset("b")] = values[frozenset("bc")] = math.nan
    found = shares(values, "abc")
    assert found is not None
    assert (found.orders, found.all_orders) == (3, 6)  # those that begin with a, and c, a, b
    assert math.fsum(found.amounts.values()) == pytest.approx(6.0)
    values[frozenset("a")] = values[frozenset("c")] = math.nan
    assert shares(values, "abc") is None


def test_states_are_every_set_once() -> None:
    found = states("abc")
    assert len(found) == len(set(found)) == 8
    assert (found[0], found[-1]) == (frozenset(), frozenset("abc"))
