"""Texts made alike before they are compared: case, accents, dashes and white do not count."""

import re
import unicodedata

_LETTERS = str.maketrans({"ß": "ss", "ø": "o", "đ": "d", "ł": "l", "æ": "ae", "œ": "oe", "þ": "th"})
_RAISED = re.compile("[\u00b9\u00b2\u00b3\u2070-\u2079\u2020\u2021]")  # marks of footnotes
_DASHES = re.compile("[\u2010-\u2015\u2212\ufe58\ufe63\uff0d]")


def without_accents(text: str) -> str:
    """Lower case, accents taken off, letters that carry none written with two.

    >>> without_accents("Älter, Straße, år, Łódź")
    'alter, strasse, ar, lodz'
    """
    split = unicodedata.normalize("NFKD", text.casefold().translate(_LETTERS))
    return "".join(sign for sign in split if not unicodedata.combining(sign))


def folded(text: str) -> str:
    """As `without_accents`, without raised figures, any dash a hyphen, white runs one blank.

    >>> folded(" 01 – 04  AÑOS ")
    '01 - 04 anos'
    """
    return " ".join(without_accents(_RAISED.sub("", _DASHES.sub("-", text))).split())
