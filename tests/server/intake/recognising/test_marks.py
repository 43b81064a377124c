"""Marks of decimals and of thousands."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from server.intake.recognising.marks import is_number, marks


@pytest.mark.parametrize(
    ("texts", "decimal", "thousands"),
    [
        (["12", "3"], ".", ""),
        (["0.25", "12"], ".", ""),
        (["12,5"], ",", ""),
        (["1.234,5"], ",", "."),
        (["1,234.5"], ".", ","),
        (["1,234,567"], ".", ","),
        (["1.234.567"], ",", "."),
        (["1.234", "12,5"], ",", "."),
        (["12,5", "1.234"], ",", "."),
        (["1 234", "12"], ".", " "),
        (["1\u202f234,5"], ",", " "),  # a form knows one blank, and reads them all
        (["1\u2019234,5"], ",", "'"),
        (["1\u00a0234", "5"], ".", " "),
        (["1'234"], ".", "'"),
        (["0,5", "note", ""], ",", ""),
    ],
)
def test_marks_that_can_be_read_in_one_way(texts: list[str], decimal: str, thousands: str) -> None:
    found = marks(texts)
    assert (found.decimal, found.thousands, found.sure) == (decimal, thousands, True)


def test_three_digits_behind_one_mark_are_in_doubt() -> None:
    found = marks(["12", "1.234", "5.678"])
    assert (found.sure, found.example) == (False, "1.234")
    assert (found.decimal, found.thousands) == (",", ".")  # counts are whole
    assert found.otherwise == (".", "")
    years = marks(["1,234"], counts=False)  # person-years need not be
    assert (years.decimal, years.thousands, years.sure) == (",", "", False)


@given(st.lists(st.integers(0, 10**7), min_size=1), st.sampled_from(".,"))
def test_whole_numbers_with_marks_of_thousands_read_back(values: list[int], mark: str) -> None:
    texts = [f"{value:,}".replace(",", mark) for value in values]
    found = marks(texts)
    read = [
        float(text.replace(found.thousands or "x", "").replace(found.decimal, "."))
        for text in texts
    ]
    assert read == values
    assert found.sure or all(text.count(mark) <= 1 for text in texts)


@given(st.lists(st.integers(0, 10**8), min_size=1), st.sampled_from(".,"))
def test_numbers_with_two_decimals_read_back(hundredths: list[int], mark: str) -> None:
    texts = [f"{value / 100:.2f}".replace(".", mark) for value in hundredths]
    found = marks(texts)
    assert (found.decimal, found.thousands, found.sure) == (mark, "", True)


def test_what_is_a_number() -> None:
    numbers = ["12", "1.234,5", "1 234", "-3", "+3", ".5", "1e5", "1\u00a0234", " 7 "]
    assert all(map(is_number, numbers))
    assert not any(map(is_number, ["85+", "1-4", "", "x", "..", "12a", "1,,2", "--1"]))
