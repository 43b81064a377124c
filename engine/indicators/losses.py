"""Years of life lost by death: on average, in proportion, before and after the threshold ages."""

from dataclasses import dataclass

import numpy as np

from engine.ages import Array
from engine.chain import Chain
from engine.indicator import Indicator, Needs
from engine.indicators.expectancy import RATIO, YEARS, at_birth
from engine.tables import LifeTable, Partials


def lost_by_group(table: LifeTable) -> Array:
    """Years lost by a death in each group on average, [..., age]."""
    share = table.ax[..., :-1] / table.grid.widths[:-1]
    here, after = table.ex[..., :-1], table.ex[..., 1:]
    return np.concatenate([after + (1 - share) * (here - after), table.ex[..., -1:]], axis=-1)


def _edagger(chain: Chain) -> Array:
    total: Array = (chain.table.dx * lost_by_group(chain.table)).sum(axis=-1)
    return total


def _lost_partials(table: LifeTable, *, per: Array, by_mean: Array) -> Partials:
    """Derivatives of e-dagger divided by `per` [..., 1], and `by_mean` [...] as that by e(0)."""
    n, dx = table.grid.widths[:-1], table.dx[..., :-1]
    share = table.ax[..., :-1] / n
    by_ex = np.concatenate([dx * (1 - share), table.dx[..., -1:]], axis=-1)
    by_ex[..., 1:] += dx * share
    by_ax = np.zeros_like(by_ex)
    by_ax[..., :-1] = dx * (table.ex[..., 1:] - table.ex[..., :-1]) / n
    by_ex = by_ex / per + at_birth(table, by_mean)
    return Partials(dx=lost_by_group(table) / per, ex=by_ex, ax=by_ax / per)


def _edagger_partials(chain: Chain) -> Partials:
    return _lost_partials(chain.table, per=np.ones(1), by_mean=np.zeros(()))


def _unevenness(chain: Chain) -> Array:
    return _edagger(chain) / chain.table.ex[..., 0]


def _unevenness_partials(chain: Chain) -> Partials:
    mean = chain.table.ex[..., :1]
    return _lost_partials(chain.table, per=mean, by_mean=-_edagger(chain) / mean[..., 0] ** 2)


@dataclass(frozen=True, slots=True)
class Threshold:
    """Where a life saved changes from lowering a measure to raising it."""

    age: Array  # [...]; nan where there is none below the open age
    group: Array  # position of the group it lies in, [...]


def threshold(table: LifeTable, level: Array) -> Threshold:
    """The age where f(x) = e†(x) / e(x) - log l(x) passes `level` [...].

    Inside a group the age is a cubic in f with the values and slopes of both ends, df/dx being
    e†(x) / e(x)^2 at every age: f rises throughout, so that there is one such age.

    Source: Zhang & Vaupel (2009), Demographic Research 20; Hermite's cubic.
    """
    ex, starts = table.ex, np.array(table.grid.starts, float)
    with np.errstate(all="ignore"):
        lost = np.flip(np.cumsum(np.flip(table.dx * lost_by_group(table), -1), -1), -1) / table.lx
        risen, pace = lost / ex - np.log(table.lx), ex**2 / lost
        after = np.argmax(risen > level[..., None], axis=-1)
        known = (after > 0) & np.isfinite(table.lx).all(axis=-1)
        group = np.where(known, after - 1, 0)

        def ends(column: Array) -> tuple[Array, Array]:
            at = group[..., None]
            low, high = (np.take_along_axis(column, x, axis=-1) for x in (at, at + 1))
            return low[..., 0], high[..., 0]

        (low, high), (first, last) = ends(risen), ends(pace)
        step, width = high - low, table.grid.widths[group]
        u = (level - low) / step
        bent = u * (1 - u) * step * ((1 - u) * first - u * last)
        age = starts[group] + width * u * u * (3 - 2 * u) + bent
    return Threshold(np.where(known, age, np.nan), group)


def _of_years_lost(chain: Chain) -> Threshold:
    return threshold(chain.table, np.ones(chain.table.lx.shape[:-1]))


def _threshold_of_years_lost(chain: Chain) -> Array:
    return _of_years_lost(chain).age


def _threshold_of_unevenness(chain: Chain) -> Array:
    return threshold(chain.table, 1 + _unevenness(chain)).age


def _early(chain: Chain) -> Array:
    """Deaths of the group that holds the threshold are split evenly by age."""
    table, found = chain.table, _of_years_lost(chain)
    starts = np.array(table.grid.starts, float)[found.group]
    inside = (found.age - starts) / table.grid.widths[found.group]
    positions, group = np.arange(len(table.grid)), found.group[..., None]
    before = np.where(positions < group, 1.0, np.where(positions == group, inside[..., None], 0.0))
    early: Array = (before * table.dx * lost_by_group(table)).sum(axis=-1)
    return early


def _late(chain: Chain) -> Array:
    return _edagger(chain) - _early(chain)


SUM_OVER_GROUPS = (
    "the sum over groups: Shkolnikov, Andreev, Zhang, Oeppen & Vaupel (2011), Losses of expected"
    " lifetime, Demography 48, 211-239"
)
SEPARATION = (
    "Zhang & Vaupel (2009), The age separating early deaths from late deaths, Demographic Research"
    " 20, 721-730"
)
IN_A_GROUP = (
    "Inside an age group it is read off a curve through the ends of the group, and the bend of that"
    " curve jumps from one group to the next."
)
NEEDS = Needs(open_deaths=True, open_small=True)

FAMILY = (
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
            f" 201-216; {SUM_OVER_GROUPS}"
        ),
        why_not_smooth="",
        needs=NEEDS,
        value=_edagger,
        partials=_edagger_partials,
    ),
    Indicator(
        key="edagger_early",
        symbol="e† early",
        label="Years lost per death on average: early deaths",
        unit=YEARS,
        definition=(
            "The part of the years lost per death on average (e-dagger) that goes with deaths below"
            " its threshold age, where a life saved draws ages at death together. With the part of"
            " late deaths it makes up the whole."
        ),
        formula=(
            "e† early = sum of d(x) times the years lost by a death, over the groups below the"
            " threshold age; of the group that holds it, the part of its years below"
        ),
        source=SEPARATION,
        why_not_smooth=(
            "Deaths of the group that holds the threshold age are split evenly, so that its slope"
            " jumps where the threshold passes from one group into the next."
        ),
        needs=NEEDS,
        value=_early,
    ),
    Indicator(
        key="edagger_late",
        symbol="e† late",
        label="Years lost per death on average: late deaths",
        unit=YEARS,
        definition=(
            "The part of the years lost per death on average (e-dagger) that goes with deaths above"
            " its threshold age, where a life saved draws ages at death apart. With the part of"
            " early deaths it makes up the whole. Groups of five years make it up to 0.2 larger."
        ),
        formula="e† late = e† - e† early",
        source=SEPARATION,
        why_not_smooth=(
            "Deaths of the group that holds the threshold age are split evenly, so that its slope"
            " jumps where the threshold passes from one group into the next."
        ),
        needs=NEEDS,
        value=_late,
    ),
    Indicator(
        key="H",
        symbol="H",
        label="Relative unevenness of length of life",
        unit=RATIO,
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
        needs=NEEDS,
        value=_unevenness,
        partials=_unevenness_partials,
    ),
    Indicator(
        key="threshold_edagger",
        symbol="a†",
        label="Threshold age of years lost (e-dagger)",
        unit=YEARS,
        definition=(
            "The age below which a life saved lowers the years lost per death on average"
            " (e-dagger), and above which it raises them: saving lives below it makes ages at death"
            " more alike. Groups of five years make it up to 0.3 lower."
        ),
        formula="the x with e†(x) / e(x) - log l(x) = 1, e†(x) the years lost per death from x on",
        source=SEPARATION,
        why_not_smooth=IN_A_GROUP,
        needs=NEEDS,
        value=_threshold_of_years_lost,
    ),
    Indicator(
        key="threshold_H",
        symbol="a H",
        label="Threshold age of relative unevenness (H)",
        unit=YEARS,
        definition=(
            "The age below which a life saved lowers the relative unevenness of length of life (H),"
            " and above which it raises it. Since a life saved lengthens life as well, it lies"
            " above the threshold age of years lost. Groups of five years make it up to 0.3 lower."
        ),
        formula=(
            "the x with e†(x) / e(x) - log l(x) = 1 + H, e†(x) the years lost per death from x on"
        ),
        source=(
            "Aburto, Alvarez, Villavicencio & Vaupel (2019), The threshold age of the lifetable"
            " entropy, Demographic Research 41, 83-102"
        ),
        why_not_smooth=IN_A_GROUP,
        needs=NEEDS,
        value=_threshold_of_unevenness,
    ),
)
