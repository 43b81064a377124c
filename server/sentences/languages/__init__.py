"""Languages beside English: one file of texts each, the English text the key, and its number signs.

A text with numbers or codes in it ("Life expectancy at 65") also stands for the same text with
others: figures are made for any ages, and nobody can list them all.
"""

import json
import re
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

# a population (north.f.2020), a number, or a placeholder, which is none
_CHANGING = re.compile(r"\{[^{}]*\}|\b[\w.-]+\.[fmp]\.\d{4}\b|\d+(?:[.,]\d+)*")


@dataclass(frozen=True, slots=True)
class Signs:
    """How numbers are printed."""

    decimal: str
    thousands: str


@dataclass(frozen=True, slots=True)
class Language:
    code: str  # BCP 47
    name: str  # in itself
    signs: Signs


OTHERS = {"es": Language("es", "español", Signs(",", "\N{NARROW NO-BREAK SPACE}"))}


@cache
def texts(code: str) -> Mapping[str, str]:
    """All texts of a language by their English.

    Raises: KeyError where there is no such language.
    """
    source = files(__package__) / f"{OTHERS[code].code}.json"
    found: dict[str, str] = json.loads(source.read_text(encoding="utf-8"))
    return found


def translated(code: str, english: str) -> str:
    """The text in a language. What no catalogue holds, a name or words that a user wrote, stays.

    >>> translated("es", "Life expectancy at 65"), translated("es", "Life expectancy at 67")
    ('Esperanza de vida a los 65 años', 'Esperanza de vida a los 67 años')
    """
    if own := texts(code).get(english):
        return own
    bare, changing = _parted(english)
    pattern = _patterns(code).get(bare) if changing else None
    return english if pattern is None else pattern.format(*changing)


@cache
def _patterns(code: str) -> Mapping[str, str]:
    """Texts without their numbers, and the translation with places for them; where a translation
    does not say each of them as often, none."""
    found = {}
    for english, other in texts(code).items():
        bare, changing = _parted(english)
        own_bare, own = _parted(other)
        if changing and sorted(changing) == sorted(own):
            places = [changing.index(one) for one in own]
            runs = own_bare.replace("{", "{{").replace("}", "}}").split("\0")
            found[bare] = runs[0] + "".join(
                f"{{{place}}}{run}" for place, run in zip(places, runs[1:], strict=True)
            )
    return found


def _parted(text: str) -> tuple[str, list[str]]:
    """A text with a mark in place of each number, and the numbers."""
    changing: list[str] = []

    def mark(found: re.Match[str]) -> str:
        if found[0].startswith("{"):
            return found[0]
        changing.append(found[0])
        return "\0"

    return _CHANGING.sub(mark, text), changing
