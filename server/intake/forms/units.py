"""What the figures of a column are counted in: a multiplier, stated or suggested by a heading."""

import re
from fractions import Fraction

from server.intake.mapping import Mapping

_MULTIPLIER = re.compile(r"\d{1,12}(?:\.\d{1,12}|/\d{1,12})?")
_POWER = r"1(?P<zeros>0{0,2}[ ,.'\u00a0\u202f]?0{3}(?:[ ,.'\u00a0\u202f]?0{3})?)(?!\d)"
_PER = re.compile(rf"\b(?:per|pr|pro|je|pour|por|cada|na|auf|op|par|por cada)\b\.? ?{_POWER}")
_IN = re.compile(rf"(?:\b(?:in|en|em|i|w)\b ?|\(|\bx ?|× ?){_POWER}")
_WORDS = (
    (re.compile(r"‰|\bper mille?\b|\bpromille\b|\bpor mil\b|\bpour mille\b|\bper thousand\b"), -3),
    (re.compile(r"%|\bper ?cent\b|\bprozent\b|\bpour ?cent\b|\bpor ciento\b|\bprocent\b"), -2),
    (re.compile(r"\bper million\b|\bje million\b|\bpar million\b"), -6),
    (re.compile(r"\bthousands?\b|\btausend\b|\bmilliers\b|\bmiles\b|\btusind\b|\btusen\b"), 3),
    (re.compile(r"[('’]000s?\b|\b000s\b|\(000\)"), 3),
    (re.compile(r"\bmillions?\b|\bmillionen\b|\bmillones\b|\bmilhões\b|\bmio\b"), 6),
)


def multiplier(text: str) -> Fraction | None:
    """A stated multiplier; None where it is none.

    >>> multiplier("1/1000"), multiplier("0")
    (Fraction(1, 1000), None)
    """
    if not _MULTIPLIER.fullmatch(text):
        return None
    _above, _, below = text.partition("/")
    if below and not int(below):
        return None
    return Fraction(text) or None


def multiplier_of(mapping: Mapping, number: str) -> Fraction:
    """What each figure of a number is multiplied by; 1 where nothing is stated."""
    return multiplier(dict(mapping.units).get(number, "1")) or Fraction(1)


def suggested(heading: str) -> str:
    """The multiplier that a heading speaks of; '' where it speaks of none.

    >>> suggested("Population (in thousands)"), suggested("deaths per 100 000"), suggested("deaths")
    ('1000', '1/100000', '')
    """
    text = " ".join(heading.casefold().split())
    for pattern, divided in ((_PER, True), (_IN, False)):
        if match := pattern.search(text):
            power = "1" + re.sub(r"\D", "", match["zeros"])
            return f"1/{power}" if divided else power
    for words, zeros in _WORDS:
        if words.search(text):
            return f"1/1{'0' * -zeros}" if zeros < 0 else f"1{'0' * zeros}"
    return ""
