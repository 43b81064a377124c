"""What is said of the ages a difference is made of: the stronger ones first, none without need."""

import pytest

from engine.indicators import INDICATORS
from server.sentences import contributions as say
from tests.server.sentences.test_comparison import asked, words
from tests.server.sentences.test_movements import estimate

CLEAR, UNCLEAR = estimate(0.02, 0.01, 0.03), estimate(0.002, -0.01, 0.014)


@pytest.mark.parametrize(
    ("below", "above", "said"),
    [
        (
            -18.4,
            10.2,
            "Ages below 80 make length of life more even (−18.4 thousandths of H)",
        ),
        (11.3, -1.0, "Ages below 80 make length of life less even (+11.3 thousandths of H)"),
        (
            -4.4,
            10.3,
            "Ages from 80 on make length of life less even (+10.3 thousandths",
        ),
        (1.8, -26.9, "those below work against it (+1.8)"),
        (-3.0, -2.0, "by −3.0 thousandths, those above by −2.0"),
    ],
)
def test_the_two_signs_of_unevenness(below: float, above: float, said: str) -> None:
    assert said in say.unevenness(asked(CLEAR, "H"), below, above, 80)


def test_an_unclear_difference_in_unevenness_is_given_no_direction() -> None:
    said = say.unevenness(asked(UNCLEAR, "H"), -4.4, 10.3, 80)
    assert said.endswith("by −4.4 thousandths, those above by +10.3")


def test_an_unclear_difference_is_owed_to_no_ages() -> None:
    assert "What each age adds" in say.by_age(asked(UNCLEAR), "60 to 79", 0.001)
    assert say.survivors(asked(UNCLEAR), 0.5, 60) == "Survivors to each age on the two sides"
    clear = asked(estimate(1.7, 1.1, 2.4))
    assert say.by_age(clear, "35 to 59", 0.93).startswith("Ages 35 to 59 make most")
    asked_for = words(say.carried("35 to 59", 0.93, 1.7, named=False))
    assert asked_for == "Ages 35 to 59 carry 0.9 of the 1.7 years."
    beside = words(say.carried("35 to 59", 0.93, 1.7, named=True))
    assert beside == "Ages 35 to 59 carry 0.9 of the 1.7 years by which life expectancy differs."


def test_no_ages_hold_more_than_the_whole() -> None:
    loss = asked(estimate(-1.7, -2.4, -1.1))
    assert "What each age adds" in say.by_age(loss, "35 to 59", -1.8)
    assert say.by_age(loss, "35 to 59", -1.6).startswith("Ages 35 to 59 make most")
    assert say.carried("35 to 59", -1.8, -1.7, named=False) == ()


def test_a_remainder_gets_its_row_only_beyond_rounding() -> None:
    life, crude = INDICATORS["e0"], INDICATORS["cdr"]
    assert say.remainder(life, 1e-12, 0.5) == ""
    assert "rule of the first year" in say.remainder(life, 1e-6, 0.5)
    assert "older or younger people" in say.remainder(crude, 1e-6, 0.5)
    assert say.remainder(crude, 0.0, 0.0) == ""
