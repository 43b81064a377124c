"""How unequal lengths of life are: measures made for incomes, read off ages at death."""

import numpy as np

from engine.ages import Array
from engine.chain import Chain
from engine.indicator import Indicator, Needs, Unit
from engine.indicators.deviation import WHERE_DEATHS_STAND
from engine.indicators.expectancy import RATIO, YEARS, at_birth
from engine.moments import group_means, group_slopes
from engine.tables import LifeTable, Partials

FINE = Unit("ratio", "ratio", 1, 4)
NEEDS = Needs(open_deaths=True, open_small=True)


def _both_alive(table: LifeTable) -> Array:
    """Integral of l(x)^2: the years that two people born together are both alive, [...]."""
    n, a, l2 = table.grid.widths[:-1], table.ax, table.lx**2
    closed = l2[..., :-1] * a[..., :-1] + l2[..., 1:] * (n - a[..., :-1])
    years: Array = closed.sum(axis=-1) + l2[..., -1] * a[..., -1] / 2
    return years


def _both_alive_partials(table: LifeTable, factor: Array) -> Partials:
    """Derivatives of the integral times `factor` [..., 1], itself held."""
    n, a, lx = table.grid.widths[:-1], table.ax, table.lx
    by_lx, by_ax = 2 * lx * a, lx**2
    by_lx[..., -1:] /= 2
    by_ax[..., -1:] /= 2
    by_lx[..., 1:] += 2 * lx[..., 1:] * (n - a[..., :-1])
    by_ax[..., :-1] -= lx[..., 1:] ** 2
    return Partials(lx=by_lx * factor, ax=by_ax * factor)


def _difference(chain: Chain) -> Array:
    return chain.table.ex[..., 0] - _both_alive(chain.table)


def _difference_partials(chain: Chain) -> Partials:
    by = _both_alive_partials(chain.table, -np.ones(1))
    return Partials(lx=by.lx, ax=by.ax, ex=at_birth(chain.table, np.ones(())))


def _gini(chain: Chain) -> Array:
    return 1 - _both_alive(chain.table) / chain.table.ex[..., 0]


def _gini_partials(chain: Chain) -> Partials:
    table = chain.table
    by = _both_alive_partials(table, -1 / table.ex[..., :1])
    by_mean = at_birth(table, _both_alive(table) / table.ex[..., 0] ** 2)
    return Partials(lx=by.lx, ax=by.ax, ex=by_mean)


def _age_log_age(age: Array) -> Array:
    return age * np.log(age)


def _theil(chain: Chain) -> Array:
    table, mean = chain.table, chain.table.ex[..., 0]
    theil: Array = (table.dx * group_means(table, _age_log_age)).sum(axis=-1) / mean - np.log(mean)
    return theil


def _theil_partials(chain: Chain) -> Partials:
    table, mean = chain.table, chain.table.ex[..., :1]
    means = group_means(table, _age_log_age)
    by_mean = -(table.dx * means).sum(axis=-1) / mean[..., 0] ** 2 - 1 / mean[..., 0]
    return Partials(
        dx=means / mean,
        ax=table.dx * group_slopes(table, lambda age: np.log(age) + 1) / mean,
        ex=at_birth(table, by_mean),
    )


def _log_deviation(chain: Chain) -> Array:
    table = chain.table
    logs: Array = (table.dx * group_means(table, np.log)).sum(axis=-1)
    return np.log(table.ex[..., 0]) - logs


def _log_deviation_partials(chain: Chain) -> Partials:
    table = chain.table
    return Partials(
        dx=-group_means(table, np.log),
        ax=-table.dx * group_slopes(table, lambda age: 1 / age),
        ex=at_birth(table, 1 / table.ex[..., 0]),
    )


FAMILY = (
    Indicator(
        key="gini",
        symbol="G",
        label="Gini coefficient of length of life",
        unit=RATIO,
        definition=(
            "How unequal lengths of life would be if the death rates of the year held for all"
            " lives: 0 if all died at one age, 1/2 if the death rate were the same at all ages."
            " Of two people picked at random, it is half the average difference between their"
            " ages at death, as a part of life expectancy at birth."
            f" {WHERE_DEATHS_STAND} Groups of five years make it up to 0.0008 smaller."
        ),
        formula=(
            "G = 1 - I / e(0), I the integral of l(x)^2: over a closed group"
            " a l(x)^2 + (n - a) l(x+n)^2, over the open group w a(w) l(w)^2 / 2"
        ),
        source=(
            "Shkolnikov, Andreev & Begun (2003), Gini coefficient as a life table function,"
            " Demographic Research 8, 305-358"
        ),
        why_not_smooth="",
        needs=NEEDS,
        value=_gini,
        partials=_gini_partials,
    ),
    Indicator(
        key="aid",
        symbol="AID",
        label="Average inter-individual difference in length of life",
        unit=YEARS,
        definition=(
            "Half the average difference between the ages at death of two people picked at random,"
            " if the death rates of the year held for all lives: the Gini coefficient times life"
            f" expectancy at birth. {WHERE_DEATHS_STAND} Groups of five years make it up to 0.07"
            " smaller."
        ),
        formula="AID = G e(0) = e(0) - I, I as for the Gini coefficient",
        source=(
            "Shkolnikov, Andreev & Begun (2003), Gini coefficient as a life table function,"
            " Demographic Research 8, 305-358"
        ),
        why_not_smooth="",
        needs=NEEDS,
        value=_difference,
        partials=_difference_partials,
    ),
    Indicator(
        key="theil",
        symbol="T",
        label="Theil index of length of life",
        unit=FINE,
        definition=(
            "How unequal lengths of life would be if the death rates of the year held for all"
            " lives, by Theil's measure: 0 if all died at one age, 0.423 if the death rate were the"
            " same at all ages. It heeds long lives more than the mean log deviation does."
            f" {WHERE_DEATHS_STAND} Groups of five years move it by up to 0.0002."
        ),
        formula=(
            "T = sum over groups of d(x) (y / e(0)) log(y / e(0)), y = x + a(x); in the open group"
            " the mean of that over its ages at death"
        ),
        source=(
            "Theil (1967), Economics and Information Theory, chapter 4; for lengths of life: van"
            " Raalte & Caswell (2013), Perturbation analysis of indices of lifespan variability,"
            " Demography 50, 1615-1640"
        ),
        why_not_smooth="",
        needs=NEEDS,
        value=_theil,
        partials=_theil_partials,
    ),
    Indicator(
        key="mld",
        symbol="MLD",
        label="Mean log deviation of length of life",
        unit=FINE,
        definition=(
            "How unequal lengths of life would be if the death rates of the year held for all"
            " lives, by the mean distance of their logarithms from that of the average: 0 if all"
            " died at one age, 0.577 if the death rate were the same at all ages. It heeds the"
            " shortest lives most; deaths under one year stand at their average age, and hours and"
            f" days within that year do not count. {WHERE_DEATHS_STAND} Groups of five years move"
            " it by up to 0.001."
        ),
        formula=(
            "MLD = log e(0) - sum over groups of d(x) log y, y = x + a(x); in the open group the"
            " mean of the logarithm over its ages at death"
        ),
        source=(
            "Theil (1967), Economics and Information Theory, chapter 4; for lengths of life: van"
            " Raalte & Caswell (2013), Perturbation analysis of indices of lifespan variability,"
            " Demography 50, 1615-1640"
        ),
        why_not_smooth="",
        needs=NEEDS,
        value=_log_deviation,
        partials=_log_deviation_partials,
    ),
)
