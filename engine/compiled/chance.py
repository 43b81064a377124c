"""Life expectancies of simulated deaths: Poisson counts by a table of their distribution.

The table answers a uniform number with a count, so that numpy's streams are kept. It holds for
means up to MOST; larger ones are left to numpy's own Poisson numbers.
"""

import math

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from engine.compiled.jit import compiled
from engine.compiled.rules import Rules, by_infant_rate

Places = NDArray[np.intp]

ENTRIES = 1024  # of the table; a mean of 900 needs about 540
LEAST = 1e-18  # chances below this are left out
GUIDE = 256  # the table is entered at the first count of each 256th of the chance


class Sampler:
    """Room to simulate one population after another in."""

    def __init__(self, rules: Rules, draws: int) -> None:
        self.rules, self.found = rules, np.empty(draws)
        self.reach, self.guide = np.empty(ENTRIES), np.empty(GUIDE, np.intp)

    def counts(self, means: Array, uniform: Array, drawn: Array) -> None:
        """Counts of means [cell] and uniform numbers [cell, draw] into drawn [cell, draw]."""
        _counts(means, uniform, self.reach, self.guide, drawn)

    def expectancies(self, drawn: Array, exposure: Array, weight: Array, ratio: Array) -> Array:
        """e0 of drawn deaths [age, draw], which are used up: [draw], to be copied."""
        weight, ratio = (np.array(part, float) for part in (weight, ratio))
        _expectancies(self.rules, drawn, np.array(exposure, float), weight, ratio, self.found)
        return self.found


@compiled
def _counts(means: Array, uniform: Array, reach: Array, guide: Places, drawn: Array) -> None:
    for cell in range(means.size):
        _cell(means[cell], uniform[cell], reach, guide, drawn[cell])


@compiled
def _cell(mean: float, uniform: Array, reach: Array, guide: Places, drawn: Array) -> None:
    """The least count whose cumulated chance is above each uniform number, [draw]; reach [ENTRIES]
    and guide [GUIDE] are room to work in."""
    first = _reaches(mean, reach)
    j = 0
    for g in range(guide.size):
        while reach[j] * guide.size <= g:
            j += 1
        guide[g] = j
    for i in range(uniform.size):
        j = int(guide[int(uniform[i] * guide.size)])
        while reach[j] <= uniform[i]:
            j += 1
        drawn[i] = first + j


@compiled
def _reaches(mean: float, reach: Array) -> int:
    """Cumulated chances of the counts, beginning with the one returned."""
    middle = int(mean)
    peak = math.exp(middle * math.log(mean) - mean - math.lgamma(middle + 1.0))
    first, chance = middle, peak
    while first > 0 and chance > LEAST:
        chance *= first / mean
        first -= 1
    total, size = 0.0, 0
    while size < reach.size - 1 and (first + size <= middle or chance > LEAST):
        total += chance
        reach[size] = total
        size += 1
        chance *= mean / (first + size)
    reach[size] = 2.0  # beyond every uniform number
    return first


@compiled
def _expectancies(
    rules: Rules,
    drawn: Array,
    exposure: Array,
    weight: Array,
    ratio: Array,
    found: Array,
) -> None:
    """e0 of each table of one population: drawn [age, draw], exposure [age], weight, ratio [2]
    -> found [draw]. From the top down, e(x) = a q + (1 - q) (n + e(x+n))."""
    top = exposure.size - 1
    for x in range(top, 0, -1):
        if exposure[x] == 0:
            for i in range(found.size):
                drawn[x - 1, i] += drawn[x, i]
    for x in range(top, -1, -1):
        source = x
        while source > 0 and exposure[source] == 0:
            source -= 1
        years = exposure[source] if exposure[source] > 0 else np.nan
        if x == top:
            for i in range(found.size):
                m = drawn[source, i] / years
                found[i] = np.nan if m == 0 else 1 / m
        elif (x == 0 and rules.first.shape[1]) or (x == 1 and rules.child.shape[1]):
            _early(rules, x, drawn[source], years, drawn[0], exposure[0], weight, ratio, found)
        else:
            _inside(rules.widths[x], drawn[source], years, found)


@compiled
def _inside(n: float, drawn: Array, years: float, found: Array) -> None:
    for i in range(found.size):
        m = drawn[i] / years
        a = 1 / m if n / 2 * m > 1 else n / 2
        q = n * m / (1 + (n - a) * m)
        q = 1.0 if q > 1 else q
        found[i] = a * q + (1 - q) * n + (1 - q) * found[i]


@compiled
def _early(
    rules: Rules,
    x: int,
    drawn: Array,
    years: float,
    infant: Array,
    infants: float,
    weight: Array,
    ratio: Array,
    found: Array,
) -> None:
    n, pieces = rules.widths[x], rules.first if x == 0 else rules.child
    for i in range(found.size):
        m, m0 = drawn[i] / years, infant[i] / infants if infants > 0 else np.nan
        a = by_infant_rate(pieces, m0, weight[0], weight[1], ratio[0], ratio[1])[0]
        a = 1 / m if a * m > 1 else a
        q = n * m / (1 + (n - a) * m)
        q = 1.0 if q > 1 else q
        found[i] = a * q + (1 - q) * n + (1 - q) * found[i]
