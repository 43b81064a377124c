"""Chances of dying between two exact ages."""

import numpy as np

from engine.ages import Array
from engine.chain import Chain
from engine.indicator import Indicator, Needs, Unit
from engine.tables import Partials


def between(first: int, last: int, *, label: str, per: str, definition: str) -> Indicator:
    """The chance that someone of exact age `first` dies before exact age `last`."""

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

    years = last - first
    return Indicator(
        key=f"{years}q{first}",
        symbol=f"{years}q{first}",
        label=label,
        unit=Unit(f"per_1000_{per.replace(' ', '_')}", f"per 1,000 {per}", 1000, 1, limits="odds"),
        definition=definition,
        formula=f"{years}q{first} = 1 - l({last}) / l({first})",
        source="Preston, Heuveline & Guillot (2001), Demography, chapter 3",
        why_not_smooth="",
        needs=Needs(ages=(first, last)),
        value=value,
        partials=partials,
    )


FAMILY = (
    between(
        15,
        60,
        label="Chance of dying between 15 and 60",
        per="aged 15",
        definition=(
            "How many of a thousand people who have reached 15 would die before they reach 60 if"
            " the death rates of the year held through those ages."
        ),
    ),
    between(
        0,
        5,
        label="Chance of dying before age 5",
        per="births",
        definition=(
            "How many of a thousand children born would die before they reach 5 if the death rates"
            " of the year held through those ages."
        ),
    ),
)
