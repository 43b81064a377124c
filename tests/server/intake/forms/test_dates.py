"""Dates that a spreadsheet made of something else."""

import datetime as dt

import pytest
from openpyxl.utils.datetime import to_excel

from server.intake.forms.dates import date_of, shows_date, typed_as


@pytest.mark.parametrize(
    ("text", "group"),
    [
        ("2026-01-04", "1–4"),  # 1-4 where months come first
        ("2026-04-01", "1–4"),  # and where days come first
        ("2026-05-09", "5–9"),
        ("2026-09-05", "5–9"),
        ("2014-10-01", "10–14"),
        ("04-Jan", "1–4"),
        ("1-Apr", "1–4"),
        ("05. Sep", "5–9"),
        ("Okt 14", "10–14"),
        ("oct-14", "10–14"),
        ("1. avr.", "1–4"),
        ("9.5.2026", "5–9"),
        ("01/04/2026", "1–4"),
        ("2026-06-06", ""),
    ],
)
def test_the_group_that_was_typed(text: str, group: str) -> None:
    assert typed_as(text) == group


@pytest.mark.parametrize(
    "text", ["1-4", "85+", "0", "", "10–14", "15 to 19", "total", "not stated"]
)
def test_what_is_no_date(text: str) -> None:
    assert typed_as(text) is None


@pytest.mark.parametrize("day", [(1900, 1, 1), (1900, 2, 28), (1900, 3, 1), (2014, 6, 30)])
def test_days_are_counted_as_spreadsheets_count_them(day: tuple[int, int, int]) -> None:
    """Against another program's count, the day that never was included."""
    moment = dt.datetime(*day)
    assert date_of(float(to_excel(moment))) == moment.date().isoformat()


def test_days_from_1904_and_times() -> None:
    assert date_of(0.0, from_1904=True) == "0:00:00"
    assert date_of(1.0, from_1904=True) == "1904-01-02"
    assert date_of(41_640.75) == "2014-01-01 18:00:00"
    assert date_of(-3.0) == "-3"
    assert date_of(1e9) == "1000000000"


@pytest.mark.parametrize(
    ("number", "code", "dated"),
    [
        (14, "", True),
        (22, "", True),
        (1, "", False),
        (49, "", False),
        (170, "yyyy\\-mm\\-dd", True),
        (170, "[$-409]d\\ mmm;@", True),
        (170, '#,##0" dead"', False),
        (170, "0.00E+00", False),
        (170, "[Red]0", False),
        (170, "General", False),
        (170, "[h]:mm", True),
    ],
)
def test_formats_that_show_a_date(number: int, code: str, dated: bool) -> None:
    assert shows_date(number, code) == dated
