"""Chances of dying between two exact ages, and survivors to one."""

import re
from dataclasses import replace

import numpy as np

from engine.ages import Array
from engine.chain import Chain
from engine.indicator import Indicator, Needs, Unit
from engine.indicators.pattern import AGE, Pattern, require_ages
from engine.tables import Partials

SOURCE = "Preston, Heuveline & Guillot (2001), Demography, chapter 3"


def between(first: int, last: int) -> Indicator:
    """The chance that someone of exact age `first` dies before exact age `last`."""
    require_ages(first, last)

    def reach(chain: Chain) -> tuple[Array, Array]:
        grid, lx = chain.table.grid, chain.table.lx
        if not (grid.has(first) and grid.has(last)):
            missing = np.full(lx.shape[:-1], np.nan)
            return missing, missing
        return lx[..., grid.position(first)], lx[..., grid.position(last)]

    def value(chain: Chain) -> Array:
        start, end = reach(chain)
        return 1 - end / start

    def partials(chain: Chain) -> Partials:
        start, end = reach(chain)
        ages = np.array(chain.table.grid.starts)
        by_start, by_end = (end / start**2)[..., None], (-1 / start)[..., None]
        return Partials(lx=by_start * (ages == first) + by_end * (ages == last))

    years, per = last - first, f"aged {first}" if first else "births"
    who = f"people who have reached {first}" if first else "children born"
    span = f"between {first} and {last}" if first else f"before age {last}"
    return Indicator(
        key=f"{years}q{first}",
        symbol=f"{years}q{first}",
        label=f"Chance of dying {span}",
        unit=Unit(f"per_1000_{per.replace(' ', '_')}", f"per 1,000 {per}", 1000, 1, limits="part"),
        definition=(
            f"How many of a thousand {who} would die before they reach {last} if the death rates"
            " of the year held through those ages."
        ),
        formula=f"{years}q{first} = 1 - l({last}) / l({first})",
        source=SOURCE,
        why_not_smooth="",
        needs=Needs(ages=(first, last)),
        value=value,
        partials=partials,
    )


def within(years: int, first: int) -> Indicator:
    """The chance of dying in so many years from an age: the numbers in the order of the key."""
    return between(first, first + years)


def survivors(age: int) -> Indicator:
    """The chance of a newborn child to reach an exact age."""
    require_ages(0, age)

    def value(chain: Chain) -> Array:
        grid, lx = chain.table.grid, chain.table.lx
        return lx[..., grid.position(age)] if grid.has(age) else np.full(lx.shape[:-1], np.nan)

    def partials(chain: Chain) -> Partials:
        return Partials(lx=(np.array(chain.table.grid.starts) == age).astype(float))

    return Indicator(
        key=f"l{age}",
        symbol=f"l{age}",
        label=f"Survivors to {age}",
        unit=Unit("per_100_births", "per 100 births", 100, 1, limits="part"),
        definition=(
            f"How many of a hundred children born would live to see {age} if the death rates of the"
            " year held through the ages before."
        ),
        formula=f"l({age}), l(0) taken as 100",
        source=SOURCE,
        why_not_smooth="",
        needs=Needs(ages=(age,)),
        value=value,
        partials=partials,
    )


_30_TO_70 = between(30, 70)

FAMILY = (
    between(15, 60),
    replace(
        _30_TO_70,
        label=f"{_30_TO_70.label}, all causes",
        definition=(
            f"{_30_TO_70.definition} Deaths from all causes count; some texts write it 30q70, and"
            " some count a few chronic diseases only."
        ),
    ),
    between(0, 5),
    survivors(65),
)
PATTERNS = (
    Pattern("40q30", re.compile(f"{AGE}q{AGE}"), within),
    Pattern("l65", re.compile(f"l{AGE}"), survivors),
)
