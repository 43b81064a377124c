"""Which causes befall one sex alone, and at which ages a cause can be.

Source: World Health Organization (2011), ICD-10, Volume 2, Instruction manual, categories limited
to, or more likely to occur in, one sex; of these only what cannot befall the other sex at all.
"""

from dataclasses import dataclass

import numpy as np

from engine.panel import SEXES
from server.intake.causes.codes import ICD_10, Range
from server.intake.causes.items import Items
from server.intake.cells import Ints

WOMEN = (
    "A34, B37.3, C51-C58, D06, D07.0-D07.3, D25-D28, D39, E28, E89.4, F53, N70-N98, O00-O99, "
    "P54.6, Q50-Q52, R87, S31.4, S37.4-S37.6"
)
MEN = (
    "B26.0, C60-C63, D07.4-D07.6, D17.6, D29, D40, E29, E89.5, I86.1, N40-N51, Q53-Q55, R86, "
    "S31.2-S31.3"
)
ALWAYS = 999  # beyond every age


@dataclass(frozen=True, slots=True)
class Ages:
    """Ages at which some codes can be the underlying cause of a death."""

    codes: str
    first: int
    last: int


AGES = (
    Ages("O00-O99", 8, 69),
    Ages("P00-P96", 0, 4),
    Ages("R95", 0, 0),
    Ages("F00-F03, G30", 15, ALWAYS),
    Ages("X60-X84, Y87.0", 5, ALWAYS),
)


def sexes_of(items: Items) -> Ints:
    """The sex that each item befalls alone, a place in SEXES; -1: both."""
    women, men = (ICD_10.ranges(codes) or () for codes in (WOMEN, MEN))
    found = np.full(len(items), -1)
    for at in range(1, len(items)):
        sex = items.sex(at)
        own = items.ranges(at) if items.list.is_icd_10 and not sex else ()
        if own:
            sex = "f" if _all_in(own, women) else "m" if _all_in(own, men) else ""
        if sex:
            found[at] = SEXES.index(sex)
    return found


def ages_of(items: Items) -> tuple[Ints, Ints]:
    """First and last age at which each item can be."""
    first, last = np.zeros(len(items), np.int64), np.full(len(items), ALWAYS)
    if not items.list.is_icd_10:
        return first, last
    limits = [(ICD_10.ranges(one.codes) or (), one) for one in AGES]
    for at in range(1, len(items)):
        own = items.ranges(at)
        for ranges, limit in limits:
            if own and _all_in(own, ranges):
                first[at], last[at] = limit.first, limit.last
    return first, last


def _all_in(own: tuple[Range, ...], ranges: tuple[Range, ...]) -> bool:
    return all(any(one.covers(part) for one in ranges) for part in own)
