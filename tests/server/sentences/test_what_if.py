"""No sentence says more of a change than its interval bears out, and all agree after rounding."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.estimates import Estimate
from engine.indicators import INDICATORS
from engine.whatif_reach import Reach
from server.sentences import death_rates, exchange, gaps, targets, what_if
from server.sentences.death_rates import Changed
from server.sentences.numbers import number
from server.sentences.pieces import plain

E0 = INDICATORS["e0"]
amounts = st.floats(-30, 30).map(lambda value: round(value, 4))


def estimate(value: float, low: float = math.nan, high: float = math.nan) -> Estimate:
    parts = (np.array(part) for part in (value, low, high))
    return Estimate(*parts, np.array(0, np.uint8), np.array(math.nan))


def words(sentence: tuple) -> str:  # type: ignore[type-arg]
    return plain(sentence).replace("\N{NO-BREAK SPACE}", " ")


@given(amounts, st.floats(0, 5), st.floats(0, 5), st.sampled_from(list(INDICATORS)))
def test_a_direction_is_told_only_where_the_interval_bears_it_out(
    value: float, below: float, above: float, key: str
) -> None:
    one = INDICATORS[key]
    scaled = value / one.unit.scale
    low, high = scaled - below / one.unit.scale, scaled + above / one.unit.scale
    of = what_if.Moved(one, estimate(0.0), estimate(scaled), estimate(scaled, low, high))
    said = words(what_if.answer("men of Bay", "2014", ["death rates 20 % lower"], of, ""))
    told = [word for word in (" higher (", " lower (", " longer (", " shorter (") if word in said]
    if low <= 0 <= high:
        assert told == []
    elif told:
        assert (told[0] in (" higher (", " longer (")) == (scaled > 0)
    if told:
        digits = one.unit.decimals
        assert number(one.unit.scale * scaled, digits) in said


def test_the_answer_names_up_to_two_changes_and_counts_more() -> None:
    of = what_if.Moved(E0, estimate(80.0), estimate(81.0), estimate(1.0, 0.8, 1.2))
    two = words(what_if.answer("men of Bay", "2014", ["this", "that"], of, ""))
    assert two == (
        "With this and that, life expectancy at birth of men of Bay in 2014 would be 1.0 years"
        " longer (0.8 to 1.2): 81.0 years instead of 80.0."
    )
    three = words(what_if.answer("men of Bay", "2014", ["this", "that", "it"], of, ""))
    assert three.startswith("With 3 changes of death rates, life expectancy")


def test_a_figure_that_does_not_rest_on_the_rates_stays() -> None:
    of = what_if.Moved(E0, estimate(80.0), estimate(80.0), estimate(0.0, 0.0, 0.0))
    assert "would stay at 80.0 years." in words(what_if.answer("x", "2014", ["y"], of, ""))
    gone = what_if.Moved(E0, estimate(80.0), estimate(math.nan), estimate(math.nan))
    assert "cannot be given. Why." in words(what_if.answer("x", "2014", ["y"], gone, "Why."))


@pytest.mark.parametrize(
    ("of", "said"),
    [
        (Changed(-20, 30, 59), "death rates 20 % lower at ages 30 to 59"),
        (
            Changed(12.5, 0, None, "Heart disease"),
            "death rates from heart disease 12.5 % higher at all ages",
        ),
        (Changed(-100, 85, None, "", "m"), "death rates of men of nil at ages 85 and over"),
        (Changed(-5, 0, 0, "HIV", "f"), "death rates of women from HIV 5 % lower at age 0"),
        (Changed(0, 1, 4), "death rates as they are at ages 1 to 4"),
    ],
)  # fmt: skip
def test_changes_in_words(of: Changed, said: str) -> None:
    assert death_rates.change(of).replace("\N{NO-BREAK SPACE}", " ") == said


@pytest.mark.parametrize(
    ("fewer", "left", "said"),
    [
        (87.4, 2487.2, "stands for 87 deaths fewer and for 2,487 years of life that would"),
        (1.2, 40.0, "stands for one death fewer and for 40 years"),
        (-20.0, -270.0, "stands for 20 deaths more and for 270 years of life lost"),
        (87.4, math.nan, "stands for 87 deaths fewer."),
        (-0.9, -7.0, "stands for one death more and for 7 years of life lost"),
    ],
)
def test_what_it_stands_for(fewer: float, left: float, said: str) -> None:
    assert said in words(what_if.stands_for("2014", fewer, left))


def test_less_than_half_a_death_stands_for_nothing() -> None:
    assert what_if.stands_for("2014", 0.4, 9.0) == ()


def reach(factor: float, low: float, high: float, without: float = 85.0) -> Reach:
    return Reach(*(np.array(part) for part in (factor, low, high, 80.0, without)))


@given(st.floats(0, 2), st.floats(0.001, 0.5))
def test_a_target_is_told_with_the_interval_of_its_change(factor: float, wide: float) -> None:
    said = words(
        targets.reach(E0, "81", "death rates", reach(factor, factor - wide, factor + wide))
    )
    percent = 100 * (1 - factor)
    if round(percent, 1) == 0:
        assert "is at 81.0 years already" in said
        return
    assert f"{number(abs(percent), 1)} % {'lower' if percent > 0 else 'higher'} (" in said
    holds = factor - wide <= 1 <= factor + wide
    assert ("The interval holds 0" in said) == holds


def test_out_of_reach_says_what_can_be_reached() -> None:
    none = reach(math.nan, math.nan, math.nan)
    said = words(targets.reach(E0, "90", "death rates at ages 30 to 59", none))
    assert "Life expectancy at birth of 90.0 years is out of reach" in said
    assert "With next to none of those deaths it would be 85.0 years." in said


def gap(value: float) -> gaps.Gap:
    return gaps.Gap("45–49", "", estimate(value, value / 2, 2 * value))


def test_only_clear_gaps_are_named() -> None:
    none = words(gaps.answer("men of Bay", "2014", [], gaps.Together(0.5, 0.4, 0.9)))
    assert none.startswith("No gap between men of Bay in 2014 and the benchmark is clear")
    assert "0.50 of a year" in none
    assert "0.40 of a year" in none
    assert "together they are" not in none
    much = words(gaps.answer("men of Bay", "2014", [], gaps.Together(1.2, 0.4, 0.9)))
    assert much.startswith(
        "No single gap between men of Bay in 2014 and the benchmark is clear, but"
    )
    assert "seldom more than 0.90 of a year" in much
    one = words(gaps.answer("men of Bay", "2014", [gap(0.1)], gaps.Together(0.5, 0.4, 0.9)))
    assert "at ages 45–49: 37 days of life expectancy (18 to 73). No other gap is clear." in one
    more = words(
        gaps.answer("men of Bay", "2014", [gap(0.1), gap(0.05)], gaps.Together(0.5, 0.4, 0.9))
    )
    assert more.endswith("(18 to 73), then at ages 45–49 (18 days).")


@given(st.floats(-9, 9), st.floats(0, 9), st.floats(0, 9))
def test_unevenness_is_told_only_where_it_is_clear(
    value: float, below: float, above: float
) -> None:
    low, high = value - below, value + above
    said = words(gaps.unevenness(value, low, high))
    if low <= 0 <= high:
        assert said == "What this would make of relative unevenness (H) is not clear."
    else:
        assert ("more even" in said) == (value < 0)
        assert ("less even" in said) == (value > 0)


def test_a_month_is_told_with_its_deaths() -> None:
    said = words(exchange.answer("men of Bay", "2014", reach(0.99, 0.98, 0.995), 3000.0))
    assert said == (
        "To make life expectancy of men of Bay in 2014 a month longer takes 1.00 % fewer deaths"
        " (0.50 to 2.00), at every age and of every cause alike: 30 of 3,000."
    )
