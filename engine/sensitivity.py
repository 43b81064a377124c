"""Where lower death rates would add most."""

import numpy as np

from engine.ages import Array
from engine.chain import Chain, Reading
from engine.tables import LifeTable, Partials, pull

ONE_PERCENT = 0.01


def of_survival(table: LifeTable) -> Array:
    """d e0 / d px, ax held: (1 / px) T(x+n) + (n - ax) lx, in years per unit of probability.

    The first term is written l(x) e(x+n), which is the same and holds where px is 0. In a closed
    table of single years with ax of a half it equals (1 / px) times the sum of l over the ages
    above x; with an open group or wider ones that sum misses years.

    Shape:   table [..., age] -> [..., age - 1]; the open group has no px.
    Missing: nan in, nan out.
    Source:  Keyfitz (1977), Applied Mathematical Demography, chapter 3; Vaupel (1986), Population
             Studies 40 (effect of a change of mortality at one age on life expectancy).
    """
    lx, years_left = table.lx[..., :-1], table.ex[..., 1:]
    return lx * years_left + (table.grid.widths[:-1] - table.ax[..., :-1]) * lx


def gain_per_percent(indicator: Reading, chain: Chain) -> Array:
    """What the indicator gains if the death rate at one age of the table were 1 % lower, in its
    unit.

    First order: -0.01 mx d indicator / d mx, ax following its rule. The rate is lowered at that age
    alone: groups joined for want of person-years, and the ages of a fitted law, each for itself.
    Divide by the group's width for a figure per year of age.

    Shape:   chain [...] -> [..., age] on the grid of its table.
    Missing: nan where the indicator or its gradient is.
    Raises:  ValueError where the indicator has no derivative, or is not read off the table.
    """
    partials = indicator.partials(chain)
    if not isinstance(partials, Partials):
        raise ValueError(f"{indicator.label} is read off the rates as counted, not off the table")
    slopes = pull(chain.table, partials)
    with np.errstate(all="ignore"):
        by_rate = slopes.mx + chain.separation.pull(slopes.ax)
        return np.asarray(-ONE_PERCENT * chain.table.mx * by_rate)
