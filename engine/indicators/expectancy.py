"""Expectation of life at birth and at later ages."""

import numpy as np

from engine.ages import Array
from engine.chain import Chain
from engine.indicator import Indicator, Needs, Unit
from engine.tables import Partials

YEARS = Unit("years", "years", 1, 1)
OLDEST = 120


def at_age(age: int) -> Indicator:
    """Life expectancy at an age in completed years."""

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


FAMILY = (at_age(0), at_age(65))
