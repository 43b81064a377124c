"""What a population-year page says."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.estimates import Estimate, Reason
from engine.indicators import INDICATORS
from server.sentences import population_year as say
from server.sentences.movements import Movement, movement
from server.sentences.pieces import Piece, Sentence, plain
from server.sentences.text import speaking
from tests.server.sentences.test_movements import differences, estimate

YEARS = INDICATORS["e0"].unit
MISSING = Estimate(
    np.float64(np.nan),  # type: ignore[arg-type]
    np.float64(np.nan),  # type: ignore[arg-type]
    np.float64(np.nan),  # type: ignore[arg-type]
    np.uint8(Reason.OPEN_GROUP_TOO_LARGE),  # type: ignore[arg-type]
    np.float64(np.nan),  # type: ignore[arg-type]
)
KNOWN = {
    "median": estimate(84.45),
    "mode": estimate(88.9),
    "edagger": estimate(9.73),
    "H": estimate(0.1186),
    "ageing_rate": estimate(0.104, 0.102, 0.105),
}
CUT = KNOWN | {"mode": MISSING, "edagger": MISSING, "H": MISSING}


def words(sentence: Sentence) -> str:
    return plain(sentence).replace("\N{NO-BREAK SPACE}", " ")


def test_the_answer_has_its_interval_in_it() -> None:
    said = say.answer("f", "Northlade", "2012", estimate(82.033, 81.888, 82.178), "")
    assert words(said) == (
        "Women of Northlade in 2012 could expect 82.0 years of life (81.9 to 82.2) at the death"
        " rates of that year."
    )
    assert [piece.emphasis for piece in said if piece.emphasis] == ["interval"]


def test_without_a_figure_the_answer_says_why() -> None:
    said = say.answer("m", "Little Auk", "2012", MISSING, "Too few people.")
    assert words(said) == (
        "Men of Little Auk in 2012: no life expectancy can be given. Too few people."
    )
    assert "(" not in words(say.answer("p", "Northlade", "2012", estimate(82.0), ""))


@pytest.mark.parametrize(
    ("change", "said"),
    [
        (estimate(0.6, 0.4, 0.8), "That is 0.6 of a year more than in 2011 (0.4 to 0.8)."),
        (estimate(-1.2, -1.6, -0.8), "That is 1.2 years less than in 2011 (0.8 to 1.6)."),
        (
            estimate(0.21, 0.003, 0.415),
            "That is 0.2 of a year more than in 2011 (0.0 to 0.4), hardly more than chance alone"
            " could do.",
        ),
        (estimate(0.1, -0.1, 0.3), "No clear change from 2011: +0.1 years (−0.1 to +0.3)."),
        (
            estimate(0.02, 0.01, 0.03),
            "The change from 2011 goes beyond chance, but is less than 0.1 of a year.",
        ),
        (
            estimate(0.4),
            "It was 0.4 of a year less in 2011; how much of the change is chance is not known.",
        ),
        (MISSING, "What changed since 2011 cannot be given."),
    ],
)
def test_the_change_from_the_year_before(change: Estimate, said: str) -> None:
    assert words(say.change(change, "2011")) == said


@given(differences())
def test_the_change_claims_no_more_than_its_interval_bears_out(change: Estimate) -> None:
    said, kind = words(say.change(change, "2011")), movement(change, YEARS)
    assert ("more than in" in said) == (kind in (Movement.MORE, Movement.BARELY_MORE))
    assert ("less than in" in said) == (kind in (Movement.LESS, Movement.BARELY_LESS))
    if change.low <= 0 <= change.high:
        assert said.startswith("No clear change")


def test_what_h_and_e_dagger_mean_is_said_in_plain_words() -> None:
    assert words(say.meanings(KNOWN)) == (
        "Half would live past age 84.4. A death at these rates costs 9.7 years of further life on"
        " average. Set against life expectancy that is an unevenness of length of life (H) of"
        " 0.119: at 0 all would reach the same age, at 1 the risk of dying would be the same at"
        " every age."
    )
    assert words(say.meanings(CUT)) == "Half would live past age 84.4."


def test_what_a_low_open_age_costs_is_said_with_a_way_out() -> None:
    said = say.not_read(CUT, open_age=85, reach=0.353, law=Piece("almanac-1-kannisto", "/there"))
    assert words(said).startswith(
        "The most common age at death, the years lost per death (e-dagger) and the unevenness of"
        " length of life (H) cannot be read off a table that ends at 85: 35 % of those born would"
        " reach that age"
    )
    assert "/there" in [piece.href for piece in said]
    assert say.not_read(KNOWN, open_age=100, reach=0.01, law=Piece("x")) == ()


def test_findings_carry_their_numbers() -> None:
    reach = {65: 0.905, 85: 0.4789}
    assert say.survivors("f", reach, KNOWN) == (
        "Of a hundred women, 90 would reach age 65 and half would live past age 84.4"
    )
    assert say.survivors("m", reach, {"median": MISSING}) == (
        "Of a hundred men, 90 would reach age 65 and 48 would reach age 85"
    )
    assert say.deaths(KNOWN).endswith("the most common age at death is 88.9")
    assert say.deaths(CUT) == "Half of the deaths fall after age 84.4"
    assert say.rates("5–9", 0, 21, KNOWN, (40, 84)) == (
        "Death rates were lowest at ages 5–9; from age 40 death rates doubled every 6.7 years of"
        " age (6.6 to 6.8)"
    )
    assert say.rates("5–9", 2, 21, {"ageing_rate": MISSING}, (40, 84)) == (
        "In 2 of 21 age groups nobody died"
    )
    assert say.rise(KNOWN, (40, 84)).replace("\N{NO-BREAK SPACE}", " ") == (
        "From 40 to 84 death rates rise at 10.4 % per year of age (10.2 to 10.5)"
    )
    assert "70 to 94: 57" in say.gain("70 to 94", 0.571)


@given(st.sampled_from(("f", "m", "p")), differences())
def test_every_word_passes_the_catalogue(sex: str, e0: Estimate) -> None:
    with speaking("pseudo"):
        for sentence in (
            say.answer(sex, "", "", e0, ""),
            say.change(e0, ""),
            say.meanings(KNOWN),
            say.not_read(CUT, open_age=85, reach=0.3, law=Piece("")),
        ):
            assert "⟦" in plain(sentence)
            assert not plain(sentence)[0].isalpha()
