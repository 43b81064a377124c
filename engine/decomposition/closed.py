"""Contributions to a difference in life expectancy at birth in closed form."""

import numpy as np

from engine.ages import Array
from engine.tables import LifeTable


def arriaga(this: LifeTable, that: LifeTable) -> Array:
    """Contribution of each age group to the difference in e0, this minus that, in closed form.

    In a group: the change of years lived in it by those who reached it before, and the years that
    those whom the change saves live afterwards, at the later table's expectation. Turned round, the
    contributions differ in more than their sign: each side's survivors meet the other's years.

    Shape:   tables [..., age] on one grid -> [..., age]; sums to the difference exactly.
    Missing: nan in, nan out.
    Raises:  ValueError where the grids differ.
    Source:  Arriaga (1984), Demography 21; Preston, Heuveline & Guillot (2001), section 3.10.
    """
    _require_one_grid(this, that)
    n = this.grid.widths[:-1]
    lived = [
        n * (1 - table.qx[..., :-1]) + table.ax[..., :-1] * table.qx[..., :-1]
        for table in (this, that)
    ]
    saved = that.qx[..., :-1] - this.qx[..., :-1]
    closed = that.lx[..., :-1] * (lived[0] - lived[1] + saved * this.ex[..., 1:])
    last = that.lx[..., -1:] * (this.ex[..., -1:] - that.ex[..., -1:])
    return np.concatenate([closed, last], axis=-1)


def pollard(this: LifeTable, that: LifeTable) -> Array:
    """Contribution of each age group to the difference in e0: the integral over the group of
    (mu_that - mu_this) w, w(x) = (l_that(x) e_this(x) + l_this(x) e_that(x)) / 2.

    Pollard evaluates the integral from rates and weights at the middle of the group; here it is
    evaluated exactly. Because d(l e*) / dx = (mu* - mu) l e* - l for the survivors l of one table
    and the expectations e* of the other, the integral over a group needs only what the tables hold
    at its ends, and is Arriaga's contribution; the mean weight makes it the mean of both ways
    round. Turned round it only changes its sign.

    Shape, missing, raises: as `arriaga`.
    Source:  Pollard (1982), Journal of the Institute of Actuaries 109, 225-240; Pollard (1988),
             Demography 25, 265-276 (the mean weight, and the agreement with Arriaga).
    """
    return (arriaga(this, that) - arriaga(that, this)) / 2


def _require_one_grid(this: LifeTable, that: LifeTable) -> None:
    if this.grid != that.grid:
        raise ValueError(
            f"the tables' age groups differ ({this.grid.code} and {that.grid.code}); "
            "bring both to one grid and one rule for the open group first"
        )
