"""The registry: every number that Ebbline reads off a life table or off death rates.

Pages, twins, the command line and the methods page read it; a new indicator is one new entry.
"""

import re

from engine.indicator import Indicator, Needs, Unit
from engine.indicators import ageing, expectancy, modes, probabilities, spread
from engine.uncertainty import difference, differences, estimate, estimates

__all__ = [
    "INDICATORS",
    "Indicator",
    "Needs",
    "Unit",
    "difference",
    "differences",
    "estimate",
    "estimates",
    "find",
]

_ENTRIES = {
    indicator.key: indicator
    for module in (expectancy, spread, modes, probabilities, ageing)
    for indicator in module.FAMILY
}
_ORDER = (
    "e0",
    "e65",
    "median",
    "mode",
    "mode_raw",
    "mode_parabola",
    "edagger",
    "H",
    "45q15",
    "5q0",
    "ageing_rate",
)
INDICATORS: dict[str, Indicator] = {
    key: _ENTRIES[key] for key in (*_ORDER, *(k for k in _ENTRIES if k not in _ORDER))
}


def find(key: str) -> Indicator:
    """The entry of this key; e and any age up to 120 is one, whether listed or not.

    Raises: ValueError that lists the keys.
    >>> find("e80").label
    'Life expectancy at 80'
    """
    if key in INDICATORS:
        return INDICATORS[key]
    named = re.fullmatch(r"e([1-9][0-9]{0,2})", key)
    if named and int(named[1]) <= expectancy.OLDEST:
        return expectancy.at_age(int(named[1]))
    raise ValueError(
        f"no indicator is named {key!r}; the names are {', '.join(INDICATORS)}, "
        f"and e followed by an age up to {expectancy.OLDEST}, such as e80"
    )
