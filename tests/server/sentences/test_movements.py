"""No direction is claimed that the interval does not bear out; what is said is what is printed."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.estimates import Estimate
from engine.indicators import INDICATORS, Unit
from server.sentences.movements import (
    Movement,
    has_interval,
    limits,
    movement,
    shown,
    size_limits,
    years,
)

YEARS = INDICATORS["e0"].unit
units = st.sampled_from(sorted({found.unit for found in INDICATORS.values()}, key=lambda u: u.key))
numbers = st.floats(-50, 50) | st.floats(-0.3, 0.3)


def estimate(value: float, low: float = np.nan, high: float = np.nan) -> Estimate:
    numbers = (np.float64(part) for part in (value, low, high))
    return Estimate(*numbers, np.uint8(0), np.float64(np.nan))  # type: ignore[arg-type]


@st.composite
def differences(draw: st.DrawFn) -> Estimate:
    low, value, high = sorted(draw(st.tuples(numbers, numbers, numbers)))
    return estimate(value, low, high)


@given(differences(), units)
def test_a_direction_is_claimed_only_where_the_whole_interval_has_it(
    difference: Estimate, unit: Unit
) -> None:
    kind = movement(difference, unit)
    if kind in (Movement.MORE, Movement.BARELY_MORE):
        assert difference.low > 0
    elif kind in (Movement.LESS, Movement.BARELY_LESS):
        assert difference.high < 0
    elif kind is Movement.NOT_CLEAR:
        assert difference.low <= 0 <= difference.high
    else:
        assert kind is Movement.TOO_SMALL


@given(differences(), units)
def test_a_clear_direction_shows_in_every_printed_number(difference: Estimate, unit: Unit) -> None:
    printed = f"{shown(difference, unit)} {limits(difference, unit)}".split()
    nought = shown(estimate(0), unit)
    kind = movement(difference, unit)
    if kind in (Movement.MORE, Movement.LESS):
        assert nought not in printed
    if kind in (Movement.BARELY_MORE, Movement.BARELY_LESS):
        assert printed.count(nought) == 1
        assert printed[0] != nought
    if kind is Movement.TOO_SMALL:
        assert printed[0] == nought


@given(differences(), units)
def test_a_loss_is_spoken_of_by_its_size(difference: Estimate, unit: Unit) -> None:
    if movement(difference, unit) in (Movement.LESS, Movement.MORE):
        assert "\N{MINUS SIGN}" not in size_limits(difference, unit)


def test_without_an_interval_or_a_value_it_says_so() -> None:
    assert movement(estimate(0.3), YEARS) is Movement.WITHOUT_INTERVAL
    assert movement(estimate(np.nan), YEARS) is Movement.UNKNOWN
    assert not has_interval(estimate(0.3))


@pytest.mark.parametrize(
    ("amount", "words"),
    [(0.24, "0.2 of a year"), (-0.96, "1.0 years"), (1.31, "1.3 years"), (0.0, "0.0 of a year")],
)
def test_years_as_they_are_spoken(amount: float, words: str) -> None:
    assert years(amount).replace("\N{NO-BREAK SPACE}", " ") == words
