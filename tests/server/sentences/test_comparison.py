"""What a comparison page says: no direction its interval does not bear out."""

import pytest
from hypothesis import given

from engine.estimates import Estimate
from engine.indicators import INDICATORS
from server.sentences import comparison as say
from server.sentences import contributions
from server.sentences.movements import Movement
from server.sentences.pieces import Sentence, plain
from tests.server.sentences.test_movements import differences, estimate

MEN_LATE = say.Named("m", "Northlade", "2012")
MEN_EARLY = say.Named("m", "Northlade", "1992")
WOMEN = say.Named("f", "Tollbay", "2012")


def words(sentence: Sentence) -> str:
    return plain(sentence).replace("\N{NO-BREAK SPACE}", " ")


def asked(
    difference: Estimate, of: str = "e0", here: float = 78.1, there: float = 72.6
) -> say.Answer:
    return say.Answer(INDICATORS[of], estimate(here), estimate(there), difference)


@pytest.mark.parametrize(
    ("this", "that", "said"),
    [
        (
            MEN_LATE,
            MEN_EARLY,
            "Men of Northlade could expect 5.5 years more of life in 2012 than in 1992 (5.3 to"
            " 5.7): 78.1 against 72.6.",
        ),
        (
            MEN_LATE,
            WOMEN,
            "Men of Northlade in 2012 could expect 5.5 years more of life than women of Tollbay"
            " (5.3 to 5.7): 78.1 against 72.6.",
        ),
        (
            MEN_EARLY,
            WOMEN,
            "Men of Northlade in 1992 could expect 5.5 years more of life than women of Tollbay in"
            " 2012 (5.3 to 5.7): 78.1 against 72.6.",
        ),
    ],
)
def test_the_answer_names_only_what_differs(this: say.Named, that: say.Named, said: str) -> None:
    sentence = say.answer(say.Pair(this, that), asked(estimate(5.5, 5.3, 5.7)), "")
    assert words(sentence) == said
    assert [piece.emphasis for piece in sentence if piece.emphasis] == ["interval"]


def test_less_is_said_by_its_size() -> None:
    said = words(say.answer(say.Pair(MEN_LATE, WOMEN), asked(estimate(-1.24, -1.8, -0.7)), ""))
    assert "could expect 1.2 years less of life" in said
    assert "(0.7 to 1.8)" in said


def test_another_indicator_is_named() -> None:
    pair = say.Pair(MEN_LATE, WOMEN)
    said = words(say.answer(pair, asked(estimate(0.04, 0.03, 0.05), "H", 0.16, 0.12), ""))
    assert said == (
        "Relative unevenness of length of life stood 0.040 higher for men of Northlade in 2012 than"
        " for women of Tollbay in 2012 (0.030 to 0.050): 0.160 against 0.120."
    )


@given(differences())
def test_no_direction_is_claimed_that_the_interval_does_not_bear_out(change: Estimate) -> None:
    pair, of = say.Pair(MEN_LATE, WOMEN), asked(change)
    said = words(say.answer(pair, of, "")) + contributions.by_age(of, "60 to 84", 1.0)
    directed = any(word in said for word in ("more of life", "less of life", "make most"))
    assert directed == of.clear
    if of.clear:
        assert change.low > 0 or change.high < 0
        assert ("more of life" in said) == (change.value > 0)
    evenness = words(say.evenness(pair, asked(change, "H", 0.16, 0.12)))
    if "more even" in evenness:
        assert change.high < 0
    elif "less even" in evenness:
        assert change.low > 0


def test_without_difference_or_without_two_sides_the_answer_says_so() -> None:
    gone = estimate(float("nan"))
    said = words(say.answer(say.Pair(MEN_LATE, WOMEN), asked(gone), "Too few people."))
    assert said.endswith("cannot be given. Too few people.")
    assert asked(gone).kind is Movement.UNKNOWN
    same = words(say.answer(say.Pair(WOMEN, WOMEN), asked(estimate(0.0)), ""))
    assert "nothing to compare" in same


def test_no_clear_difference_through_time_is_no_clear_change() -> None:
    unclear = asked(estimate(0.6, -0.2, 1.4))
    assert words(say.answer(say.Pair(MEN_LATE, MEN_EARLY), unclear, "")) == (
        "No clear change in life expectancy at birth among men of Northlade between 1992 and 2012:"
        " +0.6 years (−0.2 to +1.4)."
    )
    back = words(say.answer(say.Pair(MEN_EARLY, MEN_LATE), unclear, ""))
    assert back.startswith("No clear difference in life expectancy at birth between men of")


def test_evenness_through_time_and_between_places() -> None:
    fell = asked(estimate(-0.027, -0.03, -0.025), "H", 0.132, 0.16)
    assert "became more even: relative unevenness fell from 0.160 to 0.132" in words(
        say.evenness(say.Pair(MEN_LATE, MEN_EARLY), fell)
    )
    apart = words(say.evenness(say.Pair(MEN_LATE, WOMEN), fell))
    assert apart.endswith(": relative unevenness 0.132 against 0.160.")
    assert f"more even among {MEN_LATE.who} than among {WOMEN.who}" in apart
    turned = words(say.evenness(say.Pair(MEN_EARLY, MEN_LATE), fell))
    assert f"more even among {MEN_EARLY.whole} than among {MEN_LATE.whole}" in turned


def test_a_side_is_labelled_by_what_tells_it_from_the_other() -> None:
    assert say.Pair(MEN_LATE, MEN_EARLY).short(MEN_EARLY) == "men, 1992"
    assert say.Pair(MEN_LATE, WOMEN).short(WOMEN) == "Tollbay, women"
