"""The registry: every number that Ebbline reads off a life table or off death rates.

Pages, twins, the command line and the methods page read it. A new indicator is one entry in a
family, and its key in the group where a reader looks for it.
"""

from dataclasses import dataclass

from engine.indicator import Indicator, Needs, Unit
from engine.indicators import (
    ageing,
    births,
    deviation,
    expectancy,
    inequality,
    losses,
    modes,
    probabilities,
    quantiles,
    rates,
    standardised,
    years_of_life_lost,
)
from engine.uncertainty import difference, differences, estimate, estimates, values

__all__ = [
    "GROUPS",
    "INDICATORS",
    "Group",
    "Indicator",
    "Needs",
    "Unit",
    "difference",
    "differences",
    "estimate",
    "estimates",
    "find",
    "values",
]

FAMILIES = (
    expectancy,
    probabilities,
    quantiles,
    modes,
    losses,
    deviation,
    inequality,
    ageing,
    rates,
    standardised,
    years_of_life_lost,
    births,
)
PATTERNS = (
    *expectancy.PATTERNS,
    *probabilities.PATTERNS,
    *years_of_life_lost.PATTERNS,
    *standardised.PATTERNS,
)
_ENTRIES = {one.key: one for family in FAMILIES for one in family.FAMILY}


@dataclass(frozen=True, slots=True)
class Group:
    """Indicators that answer one question, in the order in which a reader can take them in."""

    key: str
    label: str
    question: str
    indicators: tuple[Indicator, ...]


def _group(key: str, label: str, question: str, keys: str) -> Group:
    return Group(key, label, question, tuple(_ENTRIES[one] for one in keys.split()))


GROUPS = (
    _group(
        "level",
        "Length of life",
        "How long do people live?",
        "e0 e65 e15_65 l65 median lower_quartile upper_quartile mode mode_raw mode_parabola"
        " 45q15 40q30",
    ),
    _group(
        "spread",
        "Spread",
        "How many years lie between one death and another?",
        "edagger edagger_early edagger_late sd0 sd10 iqr shortest_half aid",
    ),
    _group(
        "shape",
        "Shape",
        "How even is length of life, whatever its average?",
        "H gini cv theil mld threshold_edagger threshold_H ageing_rate",
    ),
    _group(
        "rates",
        "Death rates",
        "How many people die, for the people there are?",
        "cdr asr_esp2013 asr_esp1976 asr_who2000 asr_segi asr_us2000 smr isr yll75 yll_ref",
    ),
    _group("young", "Young lives", "How many children die?", "5q0 imr nmr pnmr sbr"),
)
INDICATORS: dict[str, Indicator] = {one.key: one for group in GROUPS for one in group.indicators}


def find(key: str) -> Indicator:
    """The entry of this key; one that names ages or a population is made for them, whether listed
    or not.

    Raises: ValueError that lists the keys and the kinds of key that name ages or a population, or
            says what is wrong with the ages.
    >>> find("e80").label
    'Life expectancy at 80'
    >>> find("20q40").label
    'Chance of dying between 40 and 60'
    >>> find("asr_by_north.f.2020").label
    'Age-standardised death rate (ages of north.f.2020)'
    """
    if key in INDICATORS:
        return INDICATORS[key]
    for pattern in PATTERNS:
        if made := pattern.find(key):
            return made
    raise ValueError(
        f"no indicator is named {key!r}; the names are {', '.join(INDICATORS)}, and with other ages"
        f" or populations {', '.join(pattern.example for pattern in PATTERNS)}"
    )
