"""Codes of areas, and how they are made from names."""

import hashlib
import re
import unicodedata

CODE = re.compile(r"[A-Za-z0-9_.-]{1,32}")
_FOLDS = str.maketrans({"ß": "ss", "ø": "o", "đ": "d", "ł": "l", "æ": "ae", "œ": "oe", "þ": "th"})


def is_code(text: str) -> bool:
    return CODE.fullmatch(text) is not None


def code_of(name: str) -> str:
    """The code made from a name: lower case, without accents, hyphens between words.

    A name without a single letter that can be written so gets a code from its digest.
    >>> code_of("Østre Mýrland (north)")
    'ostre-myrland-north'
    """
    folded = unicodedata.normalize("NFKD", name.casefold().translate(_FOLDS))
    letters = "".join(sign for sign in folded if not unicodedata.combining(sign))
    code = "-".join(re.findall(r"[a-z0-9]+", letters))[:32].strip("-")
    return code or "area-" + hashlib.sha256(name.encode()).hexdigest()[:8]
