"""What is said of causes of death: amounts as printed, no claim that a cause did anything."""

import inspect
import re

import numpy as np
import pytest

from engine.estimates import Estimate
from server.sentences import cause_methods
from server.sentences import causes as say
from server.sentences.pieces import Piece, plain

pytestmark = pytest.mark.fast


def estimate(value: float, low: float = np.nan, high: float = np.nan) -> Estimate:
    return Estimate(*(np.array(part) for part in (value, low, high, 0, np.nan)))


def said(sentence: say.Sentence) -> str:
    return plain(sentence).replace("\N{NO-BREAK SPACE}", " ")


def test_the_answer_names_the_parts_of_the_years_lost() -> None:
    parts = [
        ("Heart and circulation", estimate(3.08, 3.0, 3.16)),
        ("Cancers", estimate(2.9)),
        ("COVID-19", estimate(1.0, 0.9, 1.1)),
    ]
    assert said(say.answer("m", "North", "2014", estimate(10.54), parts, 5000)) == (
        "Of the 10.5 years lost per death of men of North in 2014, 3.1 (3.0 to 3.2) go with heart"
        " and circulation, 2.9 with cancers and 1.0 (0.9 to 1.1) with COVID-19."
    )
    two = say.answer("m", "North", "2014", estimate(10.54), parts[:1], 9, unit=say.FINER)
    assert said(two).endswith("2014, 3.08 (3.00 to 3.16) go with heart and circulation.")


def test_without_years_lost_it_tells_shares_of_deaths() -> None:
    parts = [("Stroke", estimate(0.387, 0.25, 0.54)), ("Falls", estimate(0.18, 0.09, 0.33))]
    assert said(say.answer("f", "Rock", "2012", estimate(np.nan), parts, 49)) == (
        "Of the 49 deaths of women of Rock in 2012, 39 % (25 to 54) were of stroke and 18 %"
        " (9 to 33) of falls."
    )
    assert said(say.answer("f", "Rock", "2012", estimate(np.nan), [], 0)) == (
        "Women of Rock in 2012: no death has a stated cause."
    )


def test_what_a_law_helps_with_is_linked() -> None:
    law = Piece("almanac-1-kannisto", "/there")
    sentence = say.not_read("Too many reach it.", law)
    assert law in sentence
    assert said(sentence).startswith("Years lost per death are not given: Too many reach it. With")


def test_deaths_before_75_with_and_without_a_chance() -> None:
    assert said(say.premature(50, 200, estimate(0.2, 0.15, 0.25))) == (
        "Of 200 deaths 50 fell before age 75, 25 %; of a hundred born 20.0 (15.0 to 25.0) would die"
        " before 75 at the death rates of the year."
    )
    assert said(say.premature(50, 200, estimate(np.nan))).endswith("before age 75, 25 %.")
    assert said(say.premature(0, 0, estimate(np.nan))) == "Of 0 deaths 0 fell before age 75, 0 %."


def test_no_change_is_measured_across_a_break() -> None:
    across = say.course("Stroke", "2004", 90.0, "2014", 60.0, parted=True)
    assert "90" not in across
    assert "2004" not in across
    assert say.course("Stroke", "2004", 90.0, "2014", 60.0, parted=False) == (
        "Stroke: 90.0 per 100,000 in 2004, 60.0 in 2014"
    )


def test_unclear_causes_are_told_by_their_share() -> None:
    kinds = {"natural": 900.0, "ill_defined": 80.0, "pending": 19.9, "not-stated": 0.1}
    word, text = cause_methods.unclear(kinds, 1000.0, provisional=True) or ("", "")
    assert word == "Unclear causes"
    assert "8.0\N{NO-BREAK SPACE}% are of ill-defined cause" in text
    assert "2.0\N{NO-BREAK SPACE}% still wait for a cause" in text
    assert "less than 0.1\N{NO-BREAK SPACE}% have no stated cause" in text
    told = cause_methods.unclear(kinds, 1000.0, provisional=False)
    assert told is not None
    assert "are of unknown cause" in told[1]
    assert cause_methods.unclear({"natural": 5.0}, 5.0, provisional=False) is None


def test_choices_are_told_as_they_were_made() -> None:
    kept = [("causes", "groups"), ("ill_defined", "kept"), ("ratios", "kept")]
    spread = [("causes", "groups"), ("ill_defined", "spread"), ("ratios", "applied")]
    first, second = (said(cause_methods.computed(one, [])[0]) for one in (kept, spread))
    assert "are a cause of their own" in first
    assert "spread over natural causes" in second
    assert "R99 stays" in second
    ratios = cause_methods.computed(spread, [("Dementia", "2011", 1.6)])
    assert said(ratios[-1]) == "Ratio. Dementia, before 2011: 1.600."


def test_no_sentence_gives_a_cause_or_ranks_people() -> None:
    source = inspect.getsource(say) + inspect.getsource(cause_methods)
    text = " ".join(re.findall(r'"([^"]*)"', source)).lower()
    for word in ("killed", "killer", "due to", "because of", "leading", "worst", "top cause"):
        assert word not in text, word
