"""Codes of a classification of causes, and ranges of them, compared as letters and digits."""

import re
from collections import defaultdict
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from typing import NamedTuple

_CODE = re.compile(r"([A-Za-z]*) ?(\d+)(?:\.(\d*))?")
_AFTER = re.compile(r"[ .+*†‡-]+$|(?<=\d)[xX]$")  # signs that say nothing: dagger, I21.-, I10X
_DASHES = re.compile("[\u2010-\u2015\u2212]")
_BETWEEN = re.compile(r"[,;+&]|\band\b")
_TOP = "\uffff"  # beyond every digit


class Code(NamedTuple):
    """I21.9 is ("I", 21, "9"): letters, the number before the point, the digits behind it."""

    letters: str
    number: int
    tail: str = ""


class Range(NamedTuple):
    """From one code to another, both with all that begins with them."""

    first: Code
    last: Code

    @property
    def fine(self) -> int:
        """How many digits behind the point it goes by."""
        return max(len(self.first.tail), len(self.last.tail))

    @property
    def end(self) -> Code:
        """Behind all codes that begin with the last."""
        return self.last._replace(tail=self.last.tail + _TOP)

    def holds(self, code: Code) -> bool:
        return self.first <= code <= self.end

    def meets(self, other: "Range") -> bool:
        return self.first <= other.end and other.first <= self.end

    def covers(self, other: "Range") -> bool:
        return self.first <= other.first and other.end <= self.end


@dataclass(frozen=True, slots=True)
class Notation:
    """How codes are written: how many digits stand before the point, where it is left out.

    `digits` by letters; None under all other letters. Where nothing is said, a code without a point
    has nothing behind it: 1 to 15 are whole numbers.
    """

    digits: Mapping[str, int] = field(default_factory=dict)
    otherwise: int | None = None

    def code(self, text: str) -> Code | None:
        """The code a text is, None where it is none.

        >>> ICD_10.code("i219 "), ICD_10.code("I21.-"), ICD_10.code("I2")
        (Code(letters='I', number=21, tail='9'), Code(letters='I', number=21, tail=''), None)
        """
        plain = _AFTER.sub("", _DASHES.sub("-", text.strip()))
        match = _CODE.fullmatch(plain)
        if match is None:
            return None
        letters, digits, tail = match[1].upper(), match[2], match[3] or ""
        width = self.digits.get(letters, self.otherwise)
        if width is not None:
            if len(digits) < width and letters:
                return None
            digits, tail = digits[:width], digits[width:] + tail
        return Code(letters, int(digits), tail)

    def ranges(self, text: str) -> tuple[Range, ...] | None:
        """The ranges a text names, None where some part of it is no code.

        >>> ICD_10.ranges("X60-X84, Y87.0")[1].first
        Code(letters='Y', number=87, tail='0')
        """
        found = [self._range(part) for part in _parts(text)]
        kept = tuple(one for one in found if one is not None)
        return kept if kept and len(kept) == len(found) else None

    def _range(self, part: str) -> Range | None:
        ends = part.split("-")
        if len(ends) == 2 and ends[1].strip():
            first, last = self.code(ends[0]), self.code(ends[1])
            if first and last and not last.letters and first.letters:
                last = last._replace(letters=first.letters)
        else:
            first = last = self.code(part)
        return Range(first, last) if first and last and first <= last else None


ICD_10 = Notation(otherwise=2)


def notation(texts: Iterable[str]) -> Notation:
    """The notation that some ranges are written in: of letters, or of three digits, that all have
    as many digits before the point, this number.

    >>> notation(["001-139", "E800-E999"]).digits, notation(["1-9", "10-15"]).digits
    ({'': 3, 'E': 3}, {})
    """
    widths: dict[str, set[int]] = defaultdict(set)
    for text in texts:
        for end in re.split("-|[,;+&]", _DASHES.sub("-", text)):
            if match := _CODE.fullmatch(end.strip()):
                widths[match[1].upper()].add(len(match[2]))
    alike = {letters: width.pop() for letters, width in widths.items() if len(width) == 1}
    return Notation({by: n for by, n in alike.items() if n >= (2 if by else 3)})


def _parts(text: str) -> list[str]:
    return [part.strip() for part in _BETWEEN.split(_DASHES.sub("-", text)) if part.strip()]
