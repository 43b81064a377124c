"""Numbers as people read them: the one rounding policy of every page.

A number is rounded once, from its shortest decimal form, halves to the even digit, and printed with
a true minus sign, the language's own signs (in English commas between thousands), and a space
before its unit that no line break takes.
"""

import math
from decimal import ROUND_HALF_EVEN, Context, Decimal

from server.sentences.text import _, signs

MINUS = "\N{MINUS SIGN}"
NO_BREAK = "\N{NO-BREAK SPACE}"
_EXACT = Context(prec=400, rounding=ROUND_HALF_EVEN)  # wide enough for any float


def number(value: float, decimals: int, *, signed: bool = False) -> str:
    """A number with so many decimals; `signed` prints the plus of a difference above 0.

    Raises: ValueError where the value is not finite: a gap has its own mark and reason.
    >>> number(1234.565, 2), number(-0.04, 1), number(0.25, 1, signed=True)
    ('1,234.56', '0.0', '+0.2')
    """
    if not math.isfinite(value):
        raise ValueError(f"{value!r} cannot be printed as a number; say why it is missing instead")
    exact = Decimal(str(value))
    rounded = exact.quantize(Decimal(1).scaleb(-decimals), context=_EXACT)
    sign = MINUS if rounded < 0 else "+" if signed and rounded > 0 else ""
    own = signs()
    digits = f"{abs(rounded):,f}".replace(",", "\0").replace(".", own.decimal)
    return f"{sign}{digits}".replace("\0", own.thousands)


def as_printed(value: float, decimals: int) -> float:
    """The value of what is printed, so that numbers of one sentence add up.

    >>> as_printed(76.8351, 2)
    76.84
    """
    rounded = Decimal(str(value)).quantize(Decimal(1).scaleb(-decimals), context=_EXACT)
    return float(rounded)


def whole(value: float) -> str:
    """A count.

    >>> whole(94011.6)
    '94,012'
    """
    return number(value, 0)


def as_needed(value: float) -> str:
    """A number that is a count in one sentence and a ratio in another: two decimals at most.

    >>> as_needed(94011.0), as_needed(0.8), as_needed(1.25)
    ('94,011', '0.8', '1.25')
    """
    return number(value, 2).rstrip("0").rstrip(signs().decimal)


def interval(low: float, high: float, decimals: int, *, signed: bool = False) -> str:
    """The limits of an interval, without brackets.

    >>> interval(-0.04, 0.38, 1)
    '0.0 to 0.4'
    """
    return _(
        "{low} to {high}",
        low=number(low, decimals, signed=signed),
        high=number(high, decimals, signed=signed),
    )


def with_unit(value: float, decimals: int, unit: str, *, signed: bool = False) -> str:
    """A number and its unit, which a line break does not part.

    >>> with_unit(57.2, 0, "%") == f"57{NO_BREAK}%"
    True
    """
    return f"{number(value, decimals, signed=signed)}{NO_BREAK}{unit}"
