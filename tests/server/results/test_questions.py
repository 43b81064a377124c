"""Addresses: read in any spelling, written in one."""

from random import Random
from urllib.parse import parse_qsl

import pytest
from hypothesis import given
from hypothesis import strategies as st

from server.results.questions import (
    BadValue,
    ComparisonQuestion,
    CurvesQuestion,
    PopulationYear,
    PopulationYearQuestion,
    Question,
    TrendQuestion,
    UnknownKey,
    address,
)

ALLOWED = "abcXYZ019_.-"
codes = st.text(ALLOWED, min_size=1, max_size=32)
population_years = st.builds(
    PopulationYear, codes, st.sampled_from("fmp"), st.integers(0, 9999).map("{:04}".format)
)
indicators = st.sampled_from(("e0", "H", "45q15", "mode", "e80"))
settings = st.sampled_from(("almanac-1", "almanac-1-kannisto"))
figures = st.sampled_from(("released", "full"))
questions = st.one_of(
    st.builds(PopulationYearQuestion, population_years, figures, settings),
    st.builds(CurvesQuestion, population_years, figures, settings),
    st.builds(
        ComparisonQuestion, population_years, population_years, indicators, figures, settings
    ),
    st.builds(
        TrendQuestion,
        indicators,
        st.sets(codes, max_size=4).map(lambda areas: tuple(sorted(areas))),
        st.sets(st.sampled_from("fmp")).map(lambda some: tuple(s for s in "fmp" if s in some)),
        st.sampled_from(("", "1999")),
        st.sampled_from(("", "1999", "2023")),
        figures,
        settings,
    ),
)


def read(question: Question) -> Question:
    return type(question).parse(parse_qsl(question.canonical(), keep_blank_values=True))


@given(questions)
def test_what_is_written_is_read_again(question: Question) -> None:
    assert read(question) == question


@given(questions, st.randoms(use_true_random=False))
def test_the_order_of_keys_does_not_matter(question: Question, order: Random) -> None:
    items = parse_qsl(question.canonical())
    order.shuffle(items)
    assert type(question).parse(items).canonical() == question.canonical()


@given(population_years)
def test_a_population_year_is_read_from_the_right(one: PopulationYear) -> None:
    assert PopulationYear.parse(one.code) == one


@pytest.mark.parametrize(
    "text",
    [
        "north",
        "north.f",
        "north.x.2014",
        "north.f.14",
        "no/rth.f.2014",
        ".f.2014",
        "north.f.２０１４",
    ],
)
def test_what_is_no_population_year_is_refused(text: str) -> None:
    with pytest.raises(BadValue, match=r"is not an area, sex and year.*north\.f\.2014"):
        PopulationYear.parse(text)


def test_left_out_choices_take_their_defaults() -> None:
    question = PopulationYearQuestion.parse([("of", "north.f.2014")])
    assert question.canonical() == "of=north.f.2014&figures=released&settings=almanac-1"


def test_a_plain_form_may_give_a_population_year_in_three_keys() -> None:
    parts = [("this_area", "st.john"), ("this_sex", "f"), ("this_period", "2014")]
    question = ComparisonQuestion.parse([*parts, ("that", "north.m.2013")])
    assert question.this == PopulationYear("st.john", "f", "2014")
    with pytest.raises(BadValue, match="both whole and in parts"):
        ComparisonQuestion.parse([*parts, ("this", "north.m.2013"), ("that", "north.m.2013")])


@pytest.mark.parametrize(
    ("items", "error", "words"),
    [
        ([("off", "a.f.2014")], UnknownKey, "key “off”.*It knows of, figures, settings"),
        ([("of", "a.f.2014"), ("of", "b.f.2014")], BadValue, "“of” 2 times"),
        ([], BadValue, "lacks the key “of”"),
        ([("of", "a.f.2014"), ("settings", "best")], BadValue, "can be almanac-1, almanac-1-"),
        ([("of", "a.f.2014"), ("figures", "all")], BadValue, "can be released, full"),
    ],
)
def test_what_cannot_be_read_says_what_can(
    items: list[tuple[str, str]], error: type[ValueError], words: str
) -> None:
    with pytest.raises(error, match=words):
        PopulationYearQuestion.parse(items)


def test_two_ratios_to_a_whole_are_not_compared() -> None:
    pair = [("this", "a.f.2014"), ("that", "b.f.2014")]
    with pytest.raises(BadValue, match=r"two of them do not compare.*asr_esp2013"):
        ComparisonQuestion.parse([*pair, ("of", "smr")])
    assert ComparisonQuestion.parse([*pair, ("of", "asr_esp2013")]).of == "asr_esp2013"
    assert TrendQuestion.parse([("of", "smr")]).of == "smr"


@pytest.mark.parametrize(
    ("items", "words"),
    [
        ([("of", "e0e")], "can be e0, e65,"),
        ([("area", "a b")], "1 to 32 letters"),
        ([("sex", "w")], "can be f, m, p"),
        ([("from", "99")], "four digits"),
        ([("from", "2010"), ("to", "2000")], "lies after the last"),
    ],
)
def test_a_trend_refuses_likewise(items: list[tuple[str, str]], words: str) -> None:
    with pytest.raises(BadValue, match=words):
        TrendQuestion.parse(items)


def test_a_trend_is_completed_from_what_there_is() -> None:
    question = TrendQuestion.parse([("sex", ""), ("from", "")][1:])
    full = question.completed(
        areas=["isle", "north"], sexes=["f", "m", "p"], periods=["1999", "2000", "2001"]
    )
    assert full.canonical() == (
        "of=e0&area=isle&sex=f&sex=m&from=1999&to=2001&figures=released&settings=almanac-1"
    )
    assert full.completed(areas=["x"], sexes=["p"], periods=["1950"]) == full


def test_addresses_spell_collection_edition_and_view() -> None:
    question = PopulationYearQuestion(PopulationYear("north", "f", "2014"))
    place = address("isle", 3, question, twin="csv", table="life")
    assert place == (
        "/c/isle/3/population-year.csv?of=north.f.2014&figures=released&settings=almanac-1"
        "&table=life"
    )
