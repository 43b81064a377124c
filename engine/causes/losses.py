"""Years of life lost per death, and unevenness of length of life, by cause and age: they add up."""

import numpy as np

from engine.ages import Array
from engine.causes.counts import CauseCounts
from engine.causes.number import CauseNumber
from engine.causes.parting import Parted, Slopes, part
from engine.indicator import Needs
from engine.indicators.expectancy import RATIO, YEARS, at_birth
from engine.indicators.losses import lost_by_group
from engine.panel import Panel
from engine.settings import Settings
from engine.tables import Partials

SOURCE = (
    "Vaupel & Canudas-Romo (2003), Decomposing change in life expectancy, Demography 40, 201-216"
    " (years lost by cause of death); Shkolnikov, Andreev, Zhang, Oeppen & Vaupel (2011),"
    " Demography 48, 211-239 (the sum over groups)"
)
NEEDS = Needs(open_deaths=True, open_small=True)


def years_lost(panel: Panel, causes: CauseCounts, settings: Settings) -> Array:
    """The part of e-dagger that goes with deaths of each cause at each age, d_i(x) times the years
    lost by a death in the group. All cells add up to e-dagger; divided by e(0), to H.

    Shape:   panel [..., age], causes [..., cause, age] -> [..., cause, age] on the panel's grid.
    Missing: nan where the table is.
    Source:  Vaupel & Canudas-Romo (2003), Demography 40, 201-216.
    """
    parted = part(panel, causes, settings)
    table = parted.chain.table
    lost = parted.share * (table.dx * lost_by_group(table))
    return table.grid.regroup(np.moveaxis(lost, 0, -2), panel.grid)


def _years(parted: Parted) -> Slopes:
    table, lost = parted.chain.table, lost_by_group(parted.chain.table)
    dx, n = parted.mx * table.Lx, table.grid.widths[:-1]
    inside = table.ax[..., :-1] / n
    by_ex = np.concatenate([dx[..., :-1] * (1 - inside), dx[..., -1:]], axis=-1)
    by_ex[..., 1:] += dx[..., :-1] * inside
    by_ax = np.zeros_like(by_ex)
    by_ax[..., :-1] = dx[..., :-1] * (table.ex[..., 1:] - table.ex[..., :-1]) / n
    partials = Partials(Lx=parted.mx * lost, ex=by_ex, ax=by_ax)
    return Slopes(
        (dx * lost).sum(axis=-1), partials, np.broadcast_to(table.Lx * lost, dx.shape).copy()
    )


def _unevenness(parted: Parted) -> Slopes:
    years, table = _years(parted), parted.chain.table
    mean = table.ex[..., :1]
    by_mean = at_birth(table, -years.value / mean[..., 0] ** 2)
    columns = {name: getattr(years.partials, name) / mean for name in ("Lx", "ex", "ax")}
    columns["ex"] = columns["ex"] + by_mean
    return Slopes(years.value / mean[..., 0], Partials(**columns), years.own / mean)


EDAGGER = CauseNumber(
    key="edagger",
    symbol="e†",
    label="Years lost per death on average, by cause",
    unit=YEARS,
    definition=(
        "The part of the years lost per death on average (e-dagger) that goes with deaths of the"
        " cause: how many of a life table's deaths it has, times the years that those who die"
        " of it would have had on average at their ages. Causes and ages add up to e-dagger. A"
        " hundredth of it is what life expectancy would gain if the death rates of the cause were"
        " 1 % lower at every age."
    ),
    formula=(
        "sum over closed groups of d_i(x) [e(x+n) + (1 - a(x)/n) (e(x) - e(x+n))] + d_i(w) e(w),"
        " w the open group, births taken as 1"
    ),
    source=SOURCE,
    needs=NEEDS,
    adds_up=True,
    read=_years,
)
UNEVENNESS = CauseNumber(
    key="H",
    symbol="H",
    label="Relative unevenness of length of life, by cause",
    unit=RATIO,
    definition=(
        "The part of the relative unevenness of length of life (H) that goes with deaths of the"
        " cause: its years lost per death on average, over life expectancy at birth."
    ),
    formula="e† of the cause / e(0)",
    source=SOURCE,
    needs=NEEDS,
    adds_up=True,
    read=_unevenness,
)
FAMILY = (EDAGGER, UNEVENNESS)
