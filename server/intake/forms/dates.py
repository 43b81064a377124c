"""Dates that a spreadsheet made of something else: how they are counted, and what was typed."""

import datetime as dt
import re

FIRST, FIRST_1904 = dt.datetime(1899, 12, 30), dt.datetime(1904, 1, 1)
_NEVER = 60  # number of 29 February 1900, a day that spreadsheets count though it never was
# numbers of ready-made formats that show a date or a time
_FORMATS = {*range(14, 23), *range(27, 37), *range(45, 48), *range(50, 59)}
_NO_LETTERS = re.compile(r'"[^"]*"|\\.|_.|\*.|\[[^\]]*\]')

_MONTHS = (  # beginnings of their names in the languages that share each
    "jan|ene|gen|sty",
    "feb|fev|fév|lut",
    "mar|mär|mrz|maa|mrt",
    "apr|abr|avr|kwi",
    "may|mai|maj|mei|mag",
    "jun|jui|giu|cze",
    "jul|lug|lip",
    "aug|ago|aoû|sie",
    "sep|set|wrz",
    "oct|okt|out|ott|paź",
    "nov|lis",
    "dec|dez|dic|déc|gru",
)
_MONTH = {name: number for number, names in enumerate(_MONTHS, 1) for name in names.split("|")}
_ISO = re.compile(r"(\d{4})-(\d\d)-(\d\d)(?:[T ]00:00(?::00)?)?")
_WITH_YEAR = re.compile(r"(\d{1,2})[./-](\d{1,2})[./-](\d{4}|\d\d)")
_NAMED = re.compile(r"(\d{1,4})[. /-]*([^\W\d_]{3,10})\.?|([^\W\d_]{3,10})[. /-]*(\d{1,4})")


def shows_date(number: int, code: str) -> bool:
    """Whether a format of cells, by its number or its own code, shows a date.

    >>> shows_date(14, ""), shows_date(164, "dd/mm/yyyy"), shows_date(165, '0.0" days"')
    (True, True, False)
    """
    if not code:
        return number in _FORMATS
    plain = _NO_LETTERS.sub("", code.split(";")[0]).casefold()
    return bool(re.search("[dmyhs]", plain)) and "general" not in plain


def date_of(serial: float, *, from_1904: bool = False) -> str:
    """A date as a spreadsheet counts it, or a time of the day, written with its digits.

    >>> date_of(46026.0), date_of(0.5)
    ('2026-01-04', '12:00:00')
    """
    if not 0 <= serial < 2_958_466:
        return f"{serial:.15g}"
    if serial < 1:
        return str(dt.timedelta(seconds=round(serial * 86_400)))
    days = serial if from_1904 or serial >= _NEVER else serial + 1
    moment = (FIRST_1904 if from_1904 else FIRST) + dt.timedelta(days=days)
    moment = (moment + dt.timedelta(microseconds=500_000)).replace(microsecond=0)
    return moment.date().isoformat() if serial == int(serial) else moment.isoformat(" ")


def typed_as(text: str) -> str | None:
    """The age group that a spreadsheet may have taken for this date: "1–4" for 4 January; '' where
    it is a date of no group; None where it is no date.

    >>> typed_as("2026-01-04"), typed_as("04-Jan"), typed_as("Okt 14"), typed_as("1-4")
    ('1–4', '1–4', '10–14', None)
    """
    numbers = _numbers(text.strip())
    if numbers is None:
        return None
    pairs = [(a, b) for a in numbers for b in numbers if a < b]
    usual = [(a, b) for a, b in pairs if (a % 5 == 0 and b == a + 4) or (a, b) == (1, 4)]
    others = [(a, b) for a, b in pairs if a in numbers[:2] and b in numbers[:2]]
    first, last = (usual or others or [(0, 0)])[0]
    return f"{first}–{last}" if last else ""


def _numbers(text: str) -> tuple[int, ...] | None:
    """Month and day of a date; of the first day of a month the last digits of the year too, as
    10-14 becomes October 2014."""
    if match := _ISO.fullmatch(text):
        year, month, day = (int(part) for part in match.groups())
        return (month, day, year % 100) if day == 1 else (month, day)
    if match := _WITH_YEAR.fullmatch(text):
        return int(match[1]), int(match[2])
    if match := _NAMED.fullmatch(text):
        name, number = (match[2] or match[3]).casefold(), int(match[1] or match[4])
        month = next((_MONTH[name[:size]] for size in (3,) if name[:size] in _MONTH), 0)
        return (month, number % 100) if month else None
    return None
