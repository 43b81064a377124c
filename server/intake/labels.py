"""The words of a table: ages, sexes, years and status as people write them."""

import re
from dataclasses import dataclass

OLDEST = 130  # ages above are taken for a slip of the pen

SEXES = {
    "f": ("f", "female", "females", "woman", "women", "w"),
    "m": ("m", "male", "males", "man", "men"),
    "p": ("p", "person", "persons", "total", "both", "both sexes", "all", "t"),
}
STATUSES = {
    "final": ("final", "f"),
    "provisional": ("provisional", "p", "prov", "preliminary"),
}
_SEX = {word: sex for sex, words in SEXES.items() for word in words}
_STATUS = {word: status for status, words in STATUSES.items() for word in words}

_DASHES = re.compile("[\u2010-\u2015\u2212]")
_YEARS = re.compile(r"\b(?:ages?|aged|years?|yrs?|of age|old)\b\.?|(?<=\d)y\b")
_OPEN = re.compile(
    r"(?:>=|≥) ?(\d{1,3})|(\d{1,3}) ?(?:\+|plus|(?:and|or|&) (?:over|above|older|more))"
)
_UNDER = re.compile(r"(?:<|under|less than|below) ?(\d{1,3})")
_RANGE = re.compile(r"(\d{1,3}) ?(?:-|to) ?(\d{1,3})")
_START = re.compile(r"(\d{1,3})(?:\.0+)?")
_YEAR = re.compile(r"(1[5-9]\d\d|2[0-2]\d\d)(?:\.0+)?")
_ALL_AGES = {"total", "all", "all ages"}


@dataclass(frozen=True, slots=True)
class Age:
    """An age group as labelled. `end` is the last age inside, None where the label does not say."""

    start: int
    end: int | None = None
    open: bool = False


ALL_AGES = Age(-1)  # a total over the ages


def _plain(text: str) -> str:
    return " ".join(_DASHES.sub("-", text).casefold().split())


def read_age(text: str) -> Age | None:
    """The group a label means, None where it cannot be read.

    >>> read_age("01–04"), read_age("90 years and over")
    (Age(start=1, end=4, open=False), Age(start=90, end=None, open=True))
    """
    label = _plain(text)
    if label in _ALL_AGES:
        return ALL_AGES
    label = " ".join(_YEARS.sub(" ", label).split())
    age = None
    if match := _START.fullmatch(label):
        age = Age(int(match[1]))
    elif match := _OPEN.fullmatch(label):
        age = Age(int(match[1] or match[2]), open=True)
    elif match := _RANGE.fullmatch(label):
        age = Age(int(match[1]), int(match[2]))
    elif match := _UNDER.fullmatch(label):
        age = Age(0, int(match[1]) - 1)
    if age is None or age.start > OLDEST or (age.end is not None and age.end < age.start):
        return None
    return age


def read_sex(text: str, codes: tuple[tuple[str, str], ...] = ()) -> str | None:
    """'f', 'm' or 'p'; the file's own codes go before the usual words."""
    label = _plain(text)
    own = {_plain(code): sex for code, sex in codes}
    return own.get(label, _SEX.get(label))


def read_year(text: str) -> int | None:
    """A calendar year from 1500 to 2299."""
    match = _YEAR.fullmatch(text.strip())
    return int(match[1]) if match else None


def read_status(text: str) -> str | None:
    """'final' or 'provisional'."""
    return _STATUS.get(_plain(text))
