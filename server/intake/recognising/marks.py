"""How numbers are written: which mark parts off decimals, and which parts thousands."""

import re
from collections.abc import Iterable
from dataclasses import dataclass, replace

_BLANKS = " \u00a0\u2009\u202f"
_PARTS = f"{_BLANKS}'\u2019.,"
_NUMBER = re.compile(rf"[+-]?\d+(?:[{_PARTS}]\d+)*(?:[eE][+-]?\d+)?|[+-]?[.,]\d+")
_WORDS = frozenset(
    {"n/a", "na", "n.a.", "#n/a", "n.d.", "nd", "nil", "none", "null", "nan", "missing"}
    | {"suppressed", "withheld", "confidential", "unavailable", "not available", "not applicable"}
)
LONGEST_SIGN = 5
_GROUPED = {mark: re.compile(rf"[+-]?\d{{1,3}}(?:{re.escape(mark)}\d{{3}})+") for mark in _PARTS}


@dataclass(frozen=True, slots=True)
class Marks:
    """Signs of the numbers of a file. `sure` is False where the texts can be read in two ways."""

    decimal: str = "."
    thousands: str = ""
    sure: bool = True
    example: str = ""  # a text that shows it; empty where all numbers are plain digits
    otherwise: tuple[str, str] = (".", "")  # decimal and thousands of the other way to read them


def is_number(text: str) -> bool:
    """Whether a text is a number in any way of writing it.

    >>> [is_number(text) for text in ("12", "1.234,5", "1 234", "85+", "1-4", "")]
    [True, True, True, False, False, False]
    """
    return _NUMBER.fullmatch(text.strip()) is not None


def is_sign(text: str) -> bool:
    """Whether a text may stand on purpose where a number belongs: signs alone, one letter, or a
    usual word. What it means differs from table to table.

    >>> [is_sign(text) for text in ("-", "–", "..", "x", "n/a", "12a", "-3", "north", "")]
    [True, True, True, True, True, False, False, False, False]
    """
    bare = text.strip().casefold()
    if bare in _WORDS or (len(bare) == 1 and bare.isalpha()):
        return True
    return 0 < len(bare) <= LONGEST_SIGN and not any(map(str.isalnum, bare))


def marks(texts: Iterable[str], *, counts: bool = True) -> Marks:
    """The signs that read all of some numbers, as a form states them: a blank for all blanks.

    Two different marks in one number, the same mark twice, or other than three digits behind one
    settle it. Where only such as "1.234" stand, both readings are possible: of `counts`, which are
    whole, the mark of thousands is proposed.
    """
    found = _written([text.strip() for text in texts if is_number(text)], counts=counts)
    decimal, thousands = map(_stated, found.otherwise)
    return replace(found, thousands=_stated(found.thousands), otherwise=(decimal, thousands))


def _stated(mark: str) -> str:
    return " " if mark and mark in _BLANKS else "'" if mark == "\u2019" else mark


def _written(numbers: list[str], *, counts: bool) -> Marks:
    """With the marks as they stand in the texts."""
    doubtful: list[tuple[str, str]] = []
    thousands = ""
    for text in numbers:
        kinds = re.sub(r"[\deE+-]", "", text)
        if not kinds:
            continue
        parting = next((mark for mark in kinds if mark not in ".,"), "")
        thousands = thousands or parting
        rest = [mark for mark in kinds if mark in ".,"]
        if len(set(rest)) == 2:
            return Marks(decimal=rest[-1], thousands=rest[0], example=text)
        if len(rest) > 1:
            return Marks(decimal=_other(rest[0]), thousands=rest[0], example=text)
        if len(rest) == 1 and (parting or not _GROUPED[rest[0]].fullmatch(text)):
            return Marks(decimal=rest[0], thousands=_grouping(numbers, rest[0]), example=text)
        if rest:
            doubtful.append((rest[0], text))
    if doubtful:
        mark, text = doubtful[0]
        whole, parted = (_other(mark), mark), (mark, thousands)
        first, second = (whole, parted) if counts else (parted, whole)
        return Marks(*first, sure=False, example=text, otherwise=second)
    example = next((text for text in numbers if thousands and thousands in text), "")
    return Marks(thousands=thousands, example=example)


def _other(mark: str) -> str:
    return "," if mark == "." else "."


def _grouping(numbers: list[str], decimal: str) -> str:
    """The mark of thousands beside a certain mark of decimals; empty where there is none."""
    for text in numbers:
        for mark in _PARTS:
            if mark != decimal and mark in text:
                return mark
    return ""
