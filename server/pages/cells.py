"""Estimates as cells of a table: numbers in the printed unit, or the gap that stands for them."""

from typing import NamedTuple

import numpy as np

from engine.estimates import Estimate, Reason
from engine.indicators import Unit
from engine.settings import Settings
from server.exports.table import Cell, Column, Gap, GapKind
from server.sentences import reasons
from server.sentences.reasons import reason
from server.sentences.text import _

_KINDS = {Reason.NOT_AVAILABLE: GapKind.NOT_AVAILABLE, Reason.WITHHELD: GapKind.WITHHELD}


class Triple(NamedTuple):
    """A value and the limits of its interval."""

    value: Cell
    low: Cell
    high: Cell


def gap(code: int, settings: Settings) -> Gap:
    """The gap that stands for a figure missing for this reason."""
    return Gap(_KINDS.get(Reason(code), GapKind.UNDEFINED), reason(code, settings))


def withheld() -> Gap:
    """The gap that stands for a withheld count, and for what is worked out from it alone."""
    return Gap(GapKind.WITHHELD, reasons.withheld())


def triple(estimate: Estimate, unit: Unit, settings: Settings) -> Triple:
    """An estimate without batch axes; limits that are missing give the reason."""
    missing = gap(int(estimate.reason), settings)
    return Triple(
        *(
            _scaled(float(part), unit) if np.isfinite(part) else missing
            for part in (estimate.value, estimate.low, estimate.high)
        )
    )


def _scaled(value: float, unit: Unit) -> float:
    """A figure in the printed unit; one that was given to its decimals has no others."""
    scaled = unit.scale * value
    short = round(scaled, unit.decimals)
    return short if abs(scaled - short) < 1e-11 * max(1.0, abs(scaled)) else scaled


def columns(
    key: str, label: str, decimals: int, *, unit: str = "", signed: bool = False
) -> tuple[Column, ...]:
    """The columns of a triple: the value, and its limits printed under it."""
    return (
        Column(key, label, unit, decimals, signed=signed),
        Column(f"{key}_low", _("{label}, lower limit", label=label), unit, decimals, signed, key),
        Column(f"{key}_high", _("{label}, upper limit", label=label), unit, decimals, signed, key),
    )


def number(value: float, why: str = "") -> Cell:
    """A plain number, or undefined."""
    return float(value) if np.isfinite(value) else Gap(GapKind.UNDEFINED, why)


def count(value: float) -> Cell:
    """A count, or a rate made of it: 0 is nil, which is no gap in what is known."""
    return Gap(GapKind.NIL) if value == 0 else number(value)
