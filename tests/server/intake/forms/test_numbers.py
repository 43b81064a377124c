"""Numbers under all marks; multipliers that are stated and that headings speak of."""

import math
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from server.intake.forms.numbers import DECIMALS, THOUSANDS, reader
from server.intake.forms.units import multiplier, suggested

MARKS = [(d, t) for d in DECIMALS for t in THOUSANDS if d != t]


@given(st.integers(-(10**12), 10**12), st.integers(0, 999), st.sampled_from(MARKS))
def test_a_number_comes_back_under_any_marks(whole: int, part: int, marks: tuple[str, str]) -> None:
    decimal, thousands = marks
    text = f"{whole:,}".replace(",", thousands) + f"{decimal}{part:03d}"
    assert reader(decimal, thousands)(text) == float(f"{whole}.{part:03d}")


@pytest.mark.parametrize(
    ("text", "decimal", "thousands"),
    [
        ("1.204", ",", ""),
        ("1,204", ".", ""),
        ("12.04", ",", "."),
        ("1.2.3", ".", ""),
        ("1,23,456", ".", ","),
        ("1.204.5", ",", "."),
        ("0x10", ".", ""),
        ("1_000", ".", ""),
        ("nan", ".", ""),
        ("", ".", ""),
        ("٣", ".", ""),
        ("1 204", ".", ","),
    ],
)
def test_a_text_that_is_no_number_under_its_marks(text: str, decimal: str, thousands: str) -> None:
    assert math.isnan(reader(decimal, thousands)(text))


def test_blanks_of_every_width_part_thousands() -> None:
    read = reader(",", " ")
    assert {read(f"1{blank}204,5") for blank in " \u00a0\u2009\u202f"} == {1204.5}


@pytest.mark.parametrize(
    ("text", "value"),
    [("1000", 1000), ("0.001", Fraction(1, 1000)), ("1/1000", Fraction(1, 1000)), ("1", 1)],
)
def test_multipliers(text: str, value: Fraction) -> None:
    assert multiplier(text) == value


@pytest.mark.parametrize("text", ["", "0", "0.0", "1/0", "-1", "1e9", "9" * 40, "a", "1/2/3"])
def test_what_is_no_multiplier(text: str) -> None:
    assert multiplier(text) is None


@pytest.mark.parametrize(
    ("heading", "unit"),
    [
        ("Deaths per 1000", "1/1000"),
        ("rate per 100 000", "1/100000"),
        ("Rate per 100,000 persons", "1/100000"),
        ("Sterbefälle je 1.000", "1/1000"),
        ("Døde pr. 1000", "1/1000"),
        ("tasa por 100000", "1/100000"),
        ("q(x), ‰", "1/1000"),
        ("percent", "1/100"),
        ("per million", "1/1000000"),
        ("Population (in thousands)", "1000"),
        ("Bevölkerung in 1000", "1000"),
        ("Befolkning (1 000)", "1000"),
        ("Population ('000s)", "1000"),
        ("Population, millions", "1000000"),
        ("Population", ""),
        ("Deaths 2014", ""),
        ("deaths under 1 year", ""),
        ("2000", ""),
        ("in 2000", ""),
        ("10000 steps", ""),
    ],
)
def test_headings_that_speak_of_a_unit(heading: str, unit: str) -> None:
    assert suggested(heading) == unit
