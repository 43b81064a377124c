"""Expectation of life at birth and at later ages, and years lived between two ages."""

import re

import numpy as np

from engine.ages import Array
from engine.chain import Chain
from engine.indicator import Indicator, Needs, Unit
from engine.indicators.pattern import AGE, Pattern, require_ages
from engine.tables import LifeTable, Partials

YEARS = Unit("years", "years", 1, 1)
RATIO = Unit("ratio", "ratio", 1, 3)


def at_birth(table: LifeTable, slope: Array) -> Array:
    """The partial by ex [..., age] of a number that reads e(0) alone, from its slope [...]."""
    return np.where(np.array(table.grid.starts) == 0, slope[..., None], 0.0)


def at_age(age: int) -> Indicator:
    """Life expectancy at an age in completed years."""
    require_ages(age)

    def value(chain: Chain) -> Array:
        grid, ex = chain.table.grid, chain.table.ex
        return ex[..., grid.position(age)] if grid.has(age) else np.full(ex.shape[:-1], np.nan)

    def partials(chain: Chain) -> Partials:
        return Partials(ex=(np.array(chain.table.grid.starts) == age).astype(float))

    return Indicator(
        key=f"e{age}",
        symbol=f"e{age}",
        label="Life expectancy at birth" if age == 0 else f"Life expectancy at {age}",
        unit=YEARS,
        definition=(
            "The years that a newborn child would live on average if the death rates of the year"
            " held for all its life."
            if age == 0
            else f"The years that people who have reached {age} would go on to live on average if"
            " the death rates of the year held for the rest of their lives."
        ),
        formula=f"e({age}) = T({age}) / l({age}), T({age}) the sum of L(x) from {age} on",
        source="Preston, Heuveline & Guillot (2001), Demography, chapter 3",
        why_not_smooth="",
        needs=Needs(ages=(age,), open_deaths=True),
        value=value,
        partials=partials,
    )


def between(first: int, last: int) -> Indicator:
    """Years lived from exact age `first` to exact age `last` by those who reach the first."""
    require_ages(first, last)

    def lived(table: LifeTable) -> tuple[Array, Array]:
        """Survivors to the first age, and the years they live between the two; nan off the grid."""
        grid = table.grid
        if not (grid.has(first) and grid.has(last)):
            missing = np.full(table.lx.shape[:-1], np.nan)
            return missing, missing
        start, end = grid.position(first), grid.position(last)
        return table.lx[..., start], table.Lx[..., start:end].sum(axis=-1)

    def value(chain: Chain) -> Array:
        reach, years = lived(chain.table)
        return years / reach

    def partials(chain: Chain) -> Partials:
        ages = np.array(chain.table.grid.starts)
        reach, years = (part[..., None] for part in lived(chain.table))
        inside = (first <= ages) & (ages < last)
        return Partials(Lx=inside / reach, lx=np.where(ages == first, -years / reach**2, 0.0))

    who = f"people who have reached {first}" if first else "newborn children"
    return Indicator(
        key=f"e{first}_{last}",
        symbol=f"e{first}\N{EN DASH}{last}",
        label=f"Years lived between {first} and {last}" if first else f"Years lived before {last}",
        unit=YEARS,
        definition=(
            f"The years that {who} would live on average before they reach {last} if the death"
            f" rates of the year held through those ages: {last - first} if none of them died."
        ),
        formula=f"(T({first}) - T({last})) / l({first}), T(x) the sum of L from x on",
        source=(
            "Arriaga (1984), Measuring and explaining the change in life expectancies, Demography"
            " 21, 83-96"
        ),
        why_not_smooth="",
        needs=Needs(ages=(first, last)),
        value=value,
        partials=partials,
    )


FAMILY = (at_age(0), at_age(65), between(15, 65))
PATTERNS = (
    Pattern("e80", re.compile(f"e{AGE}"), at_age),
    Pattern("e15_65", re.compile(f"e{AGE}_{AGE}"), between),
)
