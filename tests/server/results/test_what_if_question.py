"""Addresses of what-if pages: changes in rows that align, read in any spelling, written in one."""

from urllib.parse import parse_qsl

import pytest
from hypothesis import given
from hypothesis import strategies as st

from server.results.causes import CauseChoice
from server.results.exchange import ExchangeQuestion
from server.results.gaps import LEAST, GapsQuestion
from server.results.keys import BadValue, PopulationYear, UnknownKey
from server.results.what_if_question import MOST_ROWS, Row, WhatIfQuestion, Where

AT = "at=isle.p.2014"
codes = st.text("abcXYZ019_.-", min_size=1, max_size=32)
ages = st.integers(0, 110).map(str)
wheres = st.builds(
    lambda first, more, cause: Where(str(first), "" if more is None else str(first + more), cause),
    st.integers(0, 99),
    st.none() | st.integers(0, 60),
    st.just("") | codes,
)
rows = st.builds(
    Row,
    wheres,
    st.none() | st.integers(-10_000, 90_000).map(lambda hundredths: hundredths / 100),
    st.sampled_from("fmp"),
).filter(lambda row: not row.blank)
choices = st.none() | st.builds(
    CauseChoice,
    *(st.sampled_from(values) for values in CauseChoice.VALUES.values()),
)
population_years = st.builds(
    PopulationYear, codes, st.sampled_from("fmp"), st.integers(0, 9999).map("{:04}".format)
)
questions = st.builds(
    WhatIfQuestion,
    st.builds(PopulationYear, codes, st.just("p"), st.just("2014")),
    st.sampled_from(("e0", "H", "e80")),
    st.lists(rows, max_size=MOST_ROWS).map(tuple),
    st.none(),
    st.just(Where()),
    st.sampled_from(("", "80.5", "-3")),
    choices,
    st.sampled_from(("released", "full")),
    st.sampled_from(("almanac-1", "almanac-2")),
)
lending = st.builds(
    WhatIfQuestion,
    population_years,
    toward=population_years,
    toward_where=wheres,
)
others = st.builds(
    GapsQuestion,
    population_years,
    st.just("full"),
    st.just("almanac-2"),
    choices,
    st.sampled_from(LEAST),
) | st.builds(ExchangeQuestion, population_years, causes=choices)


def read(query: str) -> WhatIfQuestion:
    return WhatIfQuestion.parse(parse_qsl(query, keep_blank_values=True))


@given(questions | lending | others)
def test_what_is_written_is_read_again(
    question: WhatIfQuestion | GapsQuestion | ExchangeQuestion,
) -> None:
    items = parse_qsl(question.canonical(), keep_blank_values=True)
    assert type(question).parse(items) == question


def test_a_plain_form_spells_it_line_by_line_and_blank_lines_are_left_out() -> None:
    found = read(
        "at_area=isle&at_sex=p&at_period=2014&of=e0"
        "&by=-20+%25&from=30&to=59&sex=m&cause=heart"
        "&by=&from=0&to=&sex=p&cause="
        "&by=%E2%88%925&from=60&to=&sex=p&cause="
        "&toward_area=&toward_sex=p&toward_period=2014&toward_from=0&toward_to=&toward_cause="
        "&target=&figures=released&settings=almanac-1"
    )
    assert found.rows == (
        Row(Where("30", "59", "heart"), -20.0, "m"),
        Row(Where("60", "", ""), -5.0, "p"),
    )
    assert found.toward is None
    assert found.named == ("heart",)
    assert found.canonical().startswith(
        "at=isle.p.2014&of=e0&by=-20&from=30&to=59&sex=m&cause=heart&by=-5&from=60&to=&sex=p&cause="
    )


def test_a_line_without_a_percentage_names_what_a_target_is_sought_for() -> None:
    found = read(f"{AT}&by=&from=30&to=59&target=80")
    assert found.rows == (Row(Where("30", "59"), None),)
    assert found.changes == ()
    assert found.target == "80"


def test_what_a_line_leaves_out_wholly_is_empty() -> None:
    assert read(f"{AT}&by=-20&by=5").rows == (Row(Where(), -20.0), Row(Where(), 5.0))
    assert read(f"{AT}&by=-0").rows == (Row(Where(), 0.0),)
    assert read(f"{AT}&by=-0").canonical().count("by=0") == 1


def test_of_one_sex_a_change_is_of_everybody() -> None:
    assert read("at=isle.m.2014&by=-20&sex=m").rows == (Row(Where(), -20.0, "p"),)


@pytest.mark.parametrize(
    ("query", "words"),
    [
        (f"{AT}&by=-20&by=-5&from=30", "“from” stands 1 times"),
        (f"{AT}&by=-101", "from -100"),
        (f"{AT}&by=901", "from -100"),
        (f"{AT}&by=lots", "“by” has the value “lots”"),
        (f"{AT}&by=nan", "“by” has the value “nan”"),
        (f"{AT}&by=-20&from=x", "“from” has the value “x”"),
        (f"{AT}&by=-20&from=60&to=30", "The ages run from 60 to 30"),
        (f"{AT}&by=-20&sex=x", "“sex” has the value “x”"),
        (f"{AT}&by=-20&cause=a/b", "“cause” has the value “a/b”"),
        ("at=isle.m.2014&by=-20&sex=f", "of another sex"),
        (f"{AT}&target=much", "“target” has the value “much”"),
        (f"{AT}&toward=isle", "area.sex.year"),
        (f"{AT}&toward_area=isle", "lacks the key “toward”"),
        ("by=-20", "lacks the key “at”"),
        (AT + "&by=-1" * (MOST_ROWS + 1), f"up to {MOST_ROWS}"),
    ],
)
def test_what_cannot_be_read_says_why(query: str, words: str) -> None:
    with pytest.raises(BadValue) as refused:
        read(query)
    assert words in str(refused.value)


def test_an_unknown_key_is_refused() -> None:
    with pytest.raises(UnknownKey, match="colour"):
        read(f"{AT}&colour=red")
    with pytest.raises(BadValue, match="20000, 100000, 500000"):
        GapsQuestion.parse([("of", "isle.p.2014"), ("least", "7")])
