"""The words of a table: ages, sexes, years and status as people write them."""

import re
from collections.abc import Iterable
from dataclasses import dataclass

from server.intake import vocabulary
from server.intake.folding import folded

OLDEST = 130  # ages above are taken for a slip of the pen


@dataclass(frozen=True, slots=True)
class Age:
    """An age group as labelled. `end` is the last age inside, None where the label does not say."""

    start: int
    end: int | None = None
    open: bool = False


ALL_AGES = Age(-1)  # a total over the ages
AGE_NOT_STATED = Age(-3)  # a count that does not say its age
NOT_STATED = "not stated"  # what a sex or an area is read as that is said to be unknown


def _words(*lists: str) -> frozenset[str]:
    return frozenset(word for words in lists for word in words.split("|"))


def _any(words: str) -> str:
    """A pattern of the words, the longest first; a blank may stand for none."""
    longest = sorted(words.split("|"), key=len, reverse=True)
    return "|".join(re.escape(word) + r"\b" * word[-1].isalnum() for word in longest)


_SEX = {word: sex for sex, words in vocabulary.SEXES.items() for word in _words(words)}
_STATUS = {word: status for status, words in vocabulary.STATUSES.items() for word in _words(words)}
_TOTALS = _words(vocabulary.TOTALS)
_ALL_AGES = _words(vocabulary.TOTALS, vocabulary.ALL_AGES)
_UNKNOWN = _words(vocabulary.NOT_STATED)
_SIGNS = _words(vocabulary.NOT_STATED_SIGNS)
_AGE_CODES = _words(vocabulary.AGE_NOT_STATED)
_FIRST_YEAR = _words(vocabulary.FIRST_YEAR)
_ABOUT = re.compile(rf"\b(?:{_any(vocabulary.ABOUT)})|[():,;_\"]")
_PUNCTUATION = re.compile("[():,;]")
_FOOTNOTE = re.compile(r" ?(?:\*+|(?<![\d,;-])\(?\d\))$")
_BRACKETS = re.compile(r"\(([^()]*)\)")

_N = r"(\d{1,3})(?:[.,]0+)?"
_ONE = rf"(?:{_N}|(?:{_any(vocabulary.ONE)}))"
_YEARS = rf"(?: ?(?:{_any(vocabulary.YEARS)})\.?)*"
_LEAD = rf"(?:(?:{_any(vocabulary.YEARS)})\.?:? ?)*"
_FROM = rf"(?:(?:{_any(vocabulary.FROM)}) ?)?"
_TO = rf"(?:-|(?:{_any(vocabulary.TO)}))"

_START = re.compile(rf"{_LEAD}{_N}{_YEARS}")
_OPEN = re.compile(rf"{_LEAD}{_FROM}{_N}{_YEARS} ?(?:{_any(vocabulary.OVER)}){_YEARS}")
_OPEN_FROM = re.compile(rf"{_LEAD}(?:{_any(vocabulary.FROM_OPEN)}) ?{_N}{_YEARS}")
_RANGE = re.compile(rf"{_LEAD}{_FROM}{_N}{_YEARS} ?{_TO} ?{_N}{_YEARS}")
_BELOW = re.compile(
    rf"{_LEAD}{_FROM}{_N}{_YEARS} ?(?:{_any(vocabulary.BELOW_END)}) ?{_N}{_YEARS}"
    r"|\[(\d{1,3})[,;-] ?(\d{1,3})\)"
)
_UNDER = re.compile(rf"{_LEAD}(?:<|(?:{_any(vocabulary.UNDER)})) ?{_ONE}{_YEARS}")
_CODED = re.compile(r"y_?(?:(\d{1,3})(?:[-t](\d{1,3}))?|ge_?(\d{1,3})|lt_?(\d{1,3}))")

_SPAN = re.compile(rf"{_FROM}(\d{{1,3}}) ?{_TO} ?(\d{{1,3}}) ?")
_LESS = re.compile(rf"(?:<|(?:{_any(vocabulary.UNDER)})) ?{_ONE} ?")
_UNITS = (  # of infants, with how many make a year
    (re.compile(rf"\b(?:{_any(vocabulary.MONTHS)})\.?"), (12,)),
    (re.compile(rf"\b(?:{_any(vocabulary.DAYS)})\.?"), (365, 366)),
)


def read_age(text: str) -> Age | None:
    """The group a label means, None where it cannot be read.

    Parts of the first year (0-27 days) cannot: together they are age 0, alone they are not.
    >>> read_age("01–04"), read_age("90 years and over"), read_age("85 ans et plus")
    (Age(start=1, end=4, open=False), Age(start=90, end=None, open=True), \
Age(start=85, end=None, open=True))
    """
    label = _FOOTNOTE.sub("", folded(text))
    if match := _BRACKETS.fullmatch(label):
        label = match[1].strip()
    if label in _ALL_AGES or _PUNCTUATION.sub("", label) in _ALL_AGES:
        return ALL_AGES
    if label in _AGE_CODES or label in _SIGNS or not_stated(label):
        return AGE_NOT_STATED
    age = Age(0, 0) if label in _FIRST_YEAR else _infants(label) or _years(label)
    if age is None or age.start > OLDEST or (age.end is not None and age.end < age.start):
        return None
    return age


def _years(label: str) -> Age | None:
    """A group of whole years of age."""
    if match := _START.fullmatch(label):
        return Age(int(match[1]))
    if match := _OPEN.fullmatch(label) or _OPEN_FROM.fullmatch(label):
        return Age(int(match[1]), open=True)
    if match := _BELOW.fullmatch(label):
        return Age(int(match[1] or match[3]), int(match[2] or match[4]) - 1)
    if match := _RANGE.fullmatch(label):
        return Age(int(match[1]), int(match[2]))
    if match := _UNDER.fullmatch(label):
        return Age(0, int(match[1] or 1) - 1)
    if match := _CODED.fullmatch(label):
        if match[3]:
            return Age(int(match[3]), open=True)
        return Age(0, int(match[4]) - 1) if match[4] else _span(match[1], match[2])
    return None


def _span(first: str, last: str | None) -> Age:
    return Age(int(first), None if last is None else int(last))


def _infants(label: str) -> Age | None:
    """A group in months or days, where it is made of whole years."""
    for unit, year in _UNITS:
        plain = " ".join(unit.sub(" ", label).split())
        if plain == label or not unit.search(label):
            continue
        if (match := _SPAN.fullmatch(plain)) and int(match[1]) % year[0] == 0:
            first, behind = int(match[1]), int(match[2]) + 1
        elif match := _LESS.fullmatch(plain):
            first, behind = 0, int(match[1] or 1)
        else:
            return None
        whole = next((behind // length for length in year if behind % length == 0), 0)
        return Age(first // year[0], whole - 1) if whole else None
    return None


def not_stated(text: str) -> bool:
    """Whether a label says that something is unknown, in words: no code of an area is taken so.

    >>> not_stated("Age not stated"), not_stated("Âge inconnu"), not_stated("NS")
    (True, True, False)
    """
    label = folded(text)
    return label in _UNKNOWN or _without_matter(label) in _UNKNOWN


def _without_matter(label: str) -> str:
    """Without the words that say what it is about: "unknown" of "of unknown age"."""
    plain = " ".join(_ABOUT.sub(" ", label).split())
    return plain.removeprefix("of ").removesuffix(" of").removesuffix(" de")


def is_total(text: str) -> bool:
    """Whether a label, of an area say, is nothing but a word for the sum of all."""
    label = folded(text)
    return label in _TOTALS or _without_matter(label) in _TOTALS


def read_sex(text: str, codes: Iterable[tuple[str, str]] = ()) -> str | None:
    """'f', 'm', 'p' or NOT_STATED; the file's own codes go before the usual words."""
    label = folded(text)
    own = {folded(code): sex for code, sex in codes}
    if label in own:
        return own[label]
    for said in (label, _without_matter(label)):
        if said in _SEX:
            return _SEX[said]
        if said in _TOTALS:
            return "p"
    return NOT_STATED if label in _SIGNS or not_stated(label) else None


_YEAR = re.compile(r"(1[5-9]\d\d|2[0-2]\d\d)(?:\.0+)?")


def read_year(text: str) -> int | None:
    """A calendar year from 1500 to 2299."""
    match = _YEAR.fullmatch(text.strip())
    return int(match[1]) if match else None


def read_status(text: str) -> str | None:
    """'final' or 'provisional'."""
    return _STATUS.get(folded(text))
