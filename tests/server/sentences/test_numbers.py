"""One rounding policy, asked of any number."""

from decimal import Decimal

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from server.sentences.numbers import MINUS, NO_BREAK, interval, number, whole, with_unit
from server.sentences.text import speaking

finite = st.floats(allow_nan=False, allow_infinity=False)
decimals = st.integers(0, 8)


def read(text: str) -> Decimal:
    return Decimal(text.replace(MINUS, "-").replace(",", ""))


@given(value=finite, places=decimals)
def test_what_is_printed_lies_within_half_of_the_last_digit(value: float, places: int) -> None:
    printed = read(number(value, places))
    assert abs(printed - Decimal(repr(value))) <= Decimal(1).scaleb(-places) / 2


@given(value=st.floats(-1e6, 1e6), places=decimals)
def test_a_printed_number_read_again_prints_the_same(value: float, places: int) -> None:
    printed = number(value, places)
    assert number(float(read(printed)), places) == printed


@given(value=finite, places=decimals, signed=st.booleans())
def test_zero_has_no_sign_and_a_minus_is_a_true_minus(
    value: float, places: int, signed: bool
) -> None:
    printed = number(value, places, signed=signed)
    assert "-" not in printed
    if read(printed) == 0:
        assert printed[0] == "0"
    else:
        assert printed.startswith(MINUS) == (value < 0)
        assert printed.startswith("+") == (signed and value > 0)


@given(value=st.integers(-(10**15), 10**15))
def test_thousands_are_parted_by_commas(value: int) -> None:
    assert whole(value) == f"{value:,}".replace("-", MINUS)


@pytest.mark.parametrize(
    ("value", "places", "printed"),
    [
        (0.5, 0, "0"),
        (1.5, 0, "2"),
        (2.675, 2, "2.68"),  # the binary number lies below; what is seen is 2.675
        (2.665, 2, "2.66"),
        (-0.0, 1, "0.0"),
        (1e22, 0, "10,000,000,000,000,000,000,000"),
        (np.float64(0.125), 2, "0.12"),
        (np.int64(1000), 0, "1,000"),
    ],
)
def test_halves_go_to_the_even_digit_of_the_decimal_form(
    value: float, places: int, printed: str
) -> None:
    assert number(value, places) == printed


@pytest.mark.parametrize("value", [float("nan"), float("inf"), np.float64("nan")])
def test_a_gap_is_not_a_number(value: float) -> None:
    with pytest.raises(ValueError, match="say why it is missing"):
        number(value, 1)


def test_an_interval_reads_as_words_of_the_catalogue() -> None:
    assert interval(5.3, 5.7, 1, signed=True) == "+5.3 to +5.7"
    with speaking("pseudo"):
        assert interval(5.3, 5.7, 1) == "⟦5.3 to 5.7⟧"


def test_a_unit_stays_with_its_number() -> None:
    assert with_unit(82.04, 1, "years") == f"82.0{NO_BREAK}years"
    assert with_unit(-1.3, 1, "%", signed=True) == f"{MINUS}1.3{NO_BREAK}%"
