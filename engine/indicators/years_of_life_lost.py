"""Years of life lost: a death counts by the years it came too early."""

import re

import numpy as np

from engine.ages import Array
from engine.chain import Chain
from engine.estimates import Reason
from engine.indicator import Indicator, Needs, Unit
from engine.indicators.pattern import AGE, Pattern, require_ages
from engine.standardisation import Weighted
from engine.standards.remaining_years import GBD_2010
from engine.years_lost import before, by_reference, rate

PER_LIVED = Unit("years_per_100000", "years per 100,000 person-years", 100_000, 0, limits="gamma")
LIMITS = "Fay & Feuer (1997), Statistics in Medicine 16, 791-801 (limits)"
AGES_MATTER = (
    "It counts years as they are lost among the people there are, so it depends on how old they"
    " are."
)


def before_age(age: int) -> Indicator:
    """Years lost before an exact age."""
    require_ages(0, age)

    def read(chain: Chain) -> Weighted:
        grid, rates = chain.panel.grid, chain.rates
        younger = np.array(grid.starts) < age
        return rate(rates.mx, rates.exposure, before(grid, age), younger)

    def value(chain: Chain) -> Array:
        found = read(chain).value
        return found if chain.panel.grid.has(age) else np.full_like(found, np.nan)

    def gradient(chain: Chain) -> Array:
        return read(chain).gradient

    return Indicator(
        key=f"yll{age}",
        symbol=f"YLL {age}",
        label=f"Years of life lost before {age}",
        unit=PER_LIVED,
        definition=(
            f"The years up to age {age} that were not lived by those who died before it, for every"
            f" 100,000 years lived by people under {age}. Deaths from birth on count, each at the"
            f" middle of its age group. {AGES_MATTER}"
        ),
        formula=(
            f"sum of D(x) ({age} - x - n/2) / sum of N(x), D deaths and N person-years in the age"
            f" group x to x+n, both over groups under {age}"
        ),
        source=(
            "Romeder & McWhinnie (1977), Potential years of life lost between ages 1 and 70,"
            f" International Journal of Epidemiology 6, 143-151; {LIMITS}"
        ),
        why_not_smooth="",
        needs=Needs(ages=(age,), otherwise=Reason.AGE_NOT_ON_GRID),
        value=value,
        partials=gradient,
    )


def _reference(chain: Chain) -> Weighted:
    rates, years = chain.rates, by_reference(chain.panel.grid, GBD_2010)
    return rate(rates.mx, rates.exposure, years, np.ones(len(years), bool))


def _reference_value(chain: Chain) -> Array:
    return _reference(chain).value


def _reference_gradient(chain: Chain) -> Array:
    return _reference(chain).gradient


FAMILY = (
    before_age(75),
    Indicator(
        key="yll_ref",
        symbol="YLL ref",
        label="Years of life lost against a reference life table",
        unit=PER_LIVED,
        definition=(
            "The years that those who died would have had left by the"
            f" {GBD_2010.label} (86.02 years at birth), for every 100,000 years lived in the"
            " population. Each death counts at the middle of its age group; in the open age group"
            " half the reference's remaining years after its start, which makes the figure up to"
            " 3 % too large where that group begins at 85 and up to 6 % where at 80. No discount"
            f" and no weighting of ages. {AGES_MATTER}"
        ),
        formula=(
            "sum of D(x) e*(x + n/2) / sum of N(x), D deaths, N person-years, e* the years left by"
            " the reference, on a straight line between its ages; e*(w + e*(w)/2) in the open"
            " group from w"
        ),
        source=f"{GBD_2010.source}; {LIMITS}",
        why_not_smooth="",
        needs=Needs(),
        value=_reference_value,
        partials=_reference_gradient,
    ),
)
PATTERNS = (Pattern("yll70", re.compile(f"yll{AGE}"), before_age),)
