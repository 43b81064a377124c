"""The middle of the ages at death, and how far they lie apart."""

import numpy as np

from engine.ages import Array
from engine.chain import Chain
from engine.estimates import Reason
from engine.indicator import Indicator, Needs, Unit
from engine.indicators.expectancy import YEARS
from engine.tables import LifeTable, Partials


def _median(chain: Chain) -> Array:
    table = chain.table
    with np.errstate(all="ignore"):
        group = np.sum(np.real(table.lx) > 0.5, axis=-1) - 1
        closed = (group >= 0) & (group < len(table.grid) - 1)
        group = np.where(closed, group, 0)
        reach, deaths = (
            np.take_along_axis(column, group[..., None], axis=-1)[..., 0]
            for column in (table.lx, table.dx)
        )
        start = np.array(table.grid.starts, float)[group]
        age = start + table.grid.widths[group] * (reach - 0.5) / deaths
    return np.where(closed, age, np.nan)


def _lost_by_group(table: LifeTable) -> Array:
    """Years lost by a death in each group on average, [..., age]."""
    share = table.ax[..., :-1] / table.grid.widths[:-1]
    here, after = table.ex[..., :-1], table.ex[..., 1:]
    return np.concatenate([after + (1 - share) * (here - after), table.ex[..., -1:]], axis=-1)


def _edagger(chain: Chain) -> Array:
    total: Array = (chain.table.dx * _lost_by_group(chain.table)).sum(axis=-1)
    return total


def _spread_partials(table: LifeTable, *, per: Array, less: Array) -> Partials:
    """Derivatives of e-dagger divided by `per` [..., 1], and `less` [...] taken off that by e0."""
    n, dx = table.grid.widths[:-1], table.dx[..., :-1]
    share = table.ax[..., :-1] / n
    by_ex = np.concatenate([dx * (1 - share), table.dx[..., -1:]], axis=-1)
    by_ex[..., 1:] += dx * share
    by_ex /= per
    by_ex[..., 0] -= less
    by_ax = np.zeros_like(by_ex)
    by_ax[..., :-1] = dx * (table.ex[..., 1:] - table.ex[..., :-1]) / n / per
    return Partials(dx=_lost_by_group(table) / per, ex=by_ex, ax=by_ax)


def _edagger_partials(chain: Chain) -> Partials:
    mean = chain.table.ex[..., :1]
    return _spread_partials(chain.table, per=np.ones_like(mean), less=np.zeros_like(mean[..., 0]))


def _unevenness(chain: Chain) -> Array:
    return _edagger(chain) / chain.table.ex[..., 0]


def _unevenness_partials(chain: Chain) -> Partials:
    mean = chain.table.ex[..., :1]
    return _spread_partials(chain.table, per=mean, less=_edagger(chain) / mean[..., 0] ** 2)


FAMILY = (
    Indicator(
        key="median",
        symbol="Me",
        label="Life-table median",
        unit=YEARS,
        definition=(
            "The age that half of those born would live to see if the death rates of the year held"
            " for all their lives. Inside an age group the survivors are taken to fall evenly."
        ),
        formula="Me = x + n (l(x) - 1/2) / d(x), x to x+n the group with l(x) > 1/2 >= l(x+n)",
        source=(
            "Canudas-Romo (2010), Three measures of longevity, Demography 47, 299-312; linear l(x)"
            " inside a group as in Preston, Heuveline & Guillot (2001), Demography, chapter 3"
        ),
        why_not_smooth=(
            "It is read off survivors that are known at the ends of age groups only, and its slope"
            " jumps where it passes from one group into the next."
        ),
        needs=Needs(otherwise=Reason.OPEN_GROUP_TOO_LARGE),
        value=_median,
    ),
    Indicator(
        key="edagger",
        symbol="e†",
        label="Years lost per death on average",
        unit=YEARS,
        definition=(
            "How many more years those who die would have had on average, had they been given the"
            " life expectancy of their age: 0 if all died at one age, and larger the more unequal"
            " lengths of life are. Life expectancy inside an age group is taken to change evenly;"
            " groups of five years make it about a tenth of a year larger than single years do."
        ),
        formula=(
            "e† = sum over closed groups of d(x) [e(x+n) + (1 - a(x)/n) (e(x) - e(x+n))]"
            " + d(w) e(w), w the open group, births taken as 1"
        ),
        source=(
            "Vaupel & Canudas-Romo (2003), Decomposing change in life expectancy, Demography 40,"
            " 201-216; the sum over groups: Shkolnikov, Andreev, Zhang, Oeppen & Vaupel (2011),"
            " Losses of expected lifetime, Demography 48, 211-239"
        ),
        why_not_smooth="",
        needs=Needs(open_deaths=True, open_small=True),
        value=_edagger,
        partials=_edagger_partials,
    ),
    Indicator(
        key="H",
        symbol="H",
        label="Relative unevenness of length of life",
        unit=Unit("ratio", "ratio", 1, 3),
        definition=(
            "The years lost per death on average as a part of life expectancy at birth: 0 if all"
            " died at one age, 1 if the death rate were the same at all ages. If death rates fell"
            " by 1 % at every age, life expectancy would rise by about H %. Groups of five years"
            " make it about 0.0015 larger than single years do."
        ),
        formula="H = e† / e(0)",
        source=(
            "Leser (1955), Population Studies 9, 67-71; Keyfitz (1977), Applied Mathematical"
            " Demography, chapter 3; e† / e(0): Vaupel & Canudas-Romo (2003), Demography 40"
        ),
        why_not_smooth="",
        needs=Needs(open_deaths=True, open_small=True),
        value=_unevenness,
        partials=_unevenness_partials,
    ),
)
