"""What a difference may be said to be: never a direction that its interval does not bear out."""

from enum import Enum

import numpy as np

from engine.estimates import Estimate
from engine.indicators import Unit
from server.sentences.numbers import NO_BREAK, interval, number
from server.sentences.pieces import Piece
from server.sentences.text import _


class Movement(Enum):
    """How far a difference goes beyond chance, as printed."""

    MORE = "more"  # the whole interval lies above 0
    LESS = "less"
    BARELY_MORE = "barely more"  # above 0, but a limit prints as 0
    BARELY_LESS = "barely less"
    NOT_CLEAR = "not clear"  # the interval holds 0
    TOO_SMALL = "too small"  # beyond chance, but it prints as 0
    WITHOUT_INTERVAL = "without interval"
    UNKNOWN = "unknown"  # no value


def movement(estimate: Estimate, unit: Unit) -> Movement:
    """How a difference may be spoken of."""
    value, low, high = (
        unit.scale * float(part) for part in (estimate.value, estimate.low, estimate.high)
    )
    if not np.isfinite(value):
        return Movement.UNKNOWN
    if not (np.isfinite(low) and np.isfinite(high)):
        return Movement.WITHOUT_INTERVAL
    if low <= 0 <= high:
        return Movement.NOT_CLEAR
    if _prints_as_nought(value, unit):
        return Movement.TOO_SMALL
    nearest = low if low > 0 else high
    if _prints_as_nought(nearest, unit):
        return Movement.BARELY_MORE if value > 0 else Movement.BARELY_LESS
    return Movement.MORE if value > 0 else Movement.LESS


def _prints_as_nought(value: float, unit: Unit) -> bool:
    return number(abs(value), unit.decimals) == number(0, unit.decimals)


def shown(estimate: Estimate, unit: Unit, *, signed: bool = False) -> str:
    """The value as printed, without its unit. ValueError where there is none."""
    return number(unit.scale * float(estimate.value), unit.decimals, signed=signed)


def with_unit(text: str, unit: Unit) -> str:
    """An amount of change and its unit: percentage points of a percentage, nothing of a ratio."""
    if unit.label == "ratio":
        return text
    label = _("percentage points") if unit.label.startswith("%") else _(unit.label)
    return f"{text}\N{NO-BREAK SPACE}{label}"


def has_interval(estimate: Estimate) -> bool:
    return bool(np.isfinite(estimate.low) and np.isfinite(estimate.high))


def limits(estimate: Estimate, unit: Unit, *, signed: bool = False) -> str:
    """The interval as printed: 81.9 to 82.2. ValueError where there is none."""
    low, high = (unit.scale * float(part) for part in (estimate.low, estimate.high))
    return interval(low, high, unit.decimals, signed=signed)


def size_limits(estimate: Estimate, unit: Unit) -> str:
    """The interval of a difference spoken of by its size: '0.1 to 0.5' of a loss of 0.3."""
    low, high = (unit.scale * float(part) for part in (estimate.low, estimate.high))
    if estimate.value < 0:
        low, high = -high, -low
    return interval(low, high, unit.decimals)


def bracketed(text: str) -> Piece:
    """An interval in a sentence, set in the second ink."""
    return Piece(f"({text})", emphasis="interval")


def years(value: float, decimals: int = 1) -> str:
    """An amount of years as it is spoken, its sign left out: 0.2 of a year, 1.3 years.

    >>> years(-0.24), years(1.26)
    ('0.2\\xa0of a year', '1.3\\xa0years')
    """
    text = number(abs(value), decimals)
    if float(text.replace(",", "")) < 1:
        return _("{amount}\N{NO-BREAK SPACE}of a year", amount=text)
    return _("{amount}\N{NO-BREAK SPACE}years", amount=text)


def value(of: float, unit: Unit) -> str:
    """A figure with its unit, as printed."""
    text = number(unit.scale * of, unit.decimals)
    return text if unit.label == "ratio" else f"{text}{NO_BREAK}{_(unit.label)}"
