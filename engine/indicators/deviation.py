"""How far ages at death lie from their mean."""

import numpy as np

from engine.ages import Array
from engine.chain import Chain
from engine.indicator import Indicator, Needs
from engine.indicators.expectancy import RATIO, YEARS, at_birth
from engine.moments import group_means, group_slopes
from engine.tables import LifeTable, Partials

WHERE_DEATHS_STAND = (
    "Deaths of a closed age group stand at their average age; those of the open group follow a"
    " constant death rate."
)


def _deviation(table: LifeTable, age: int) -> Array:
    """Standard deviation of the age at death of those who reach an age; nan off the grid."""
    if not table.grid.has(age):
        return np.full(table.lx.shape[:-1], np.nan)
    at = table.grid.position(age)
    mean = age + table.ex[..., at, None]
    squares = group_means(table, lambda x: (x - mean) ** 2)
    spread: Array = np.sqrt((table.dx * squares)[..., at:].sum(axis=-1) / table.lx[..., at])
    return spread


def _deviation_partials(table: LifeTable, age: int, *, per: Array) -> Partials:
    """Derivatives of the standard deviation divided by `per` [..., 1], itself held. The mean moves
    nothing, since the distances to it add up to 0."""
    if not table.grid.has(age):
        return Partials(dx=np.full(table.dx.shape, np.nan))
    at, ages = table.grid.position(age), np.array(table.grid.starts)
    mean, spread = age + table.ex[..., at, None], _deviation(table, age)[..., None]
    counted = (ages >= age) / (2 * spread * table.lx[..., at, None] * per)
    return Partials(
        dx=counted * group_means(table, lambda x: (x - mean) ** 2),
        ax=counted * table.dx * group_slopes(table, lambda x: 2 * (x - mean)),
        lx=np.where(ages == age, -counted * spread**2, 0.0),
    )


def deviation(age: int, *, label: str, definition: str, source: str) -> Indicator:
    """The standard deviation of the age at death of those who reach an age."""

    def value(chain: Chain) -> Array:
        return _deviation(chain.table, age)

    def partials(chain: Chain) -> Partials:
        return _deviation_partials(chain.table, age, per=np.ones(1))

    return Indicator(
        key=f"sd{age}",
        symbol=f"s{age}",
        label=label,
        unit=YEARS,
        definition=f"{definition} {WHERE_DEATHS_STAND} Groups of five years move it by up to 0.03.",
        formula=(
            f"s{age} = square root of the sum over groups from {age} of"
            f" d(x) [(x + a(x) - A)^2 + v(x)] / l({age}); A = {age} + e({age}),"
            " v = a(w)^2 in the open group w and 0 elsewhere"
        ),
        source=source,
        why_not_smooth="",
        needs=Needs(ages=(age,), open_deaths=True, open_small=True),
        value=value,
        partials=partials,
    )


def _variation(chain: Chain) -> Array:
    return _deviation(chain.table, 0) / chain.table.ex[..., 0]


def _variation_partials(chain: Chain) -> Partials:
    mean = chain.table.ex[..., :1]
    by = _deviation_partials(chain.table, 0, per=mean)
    by_mean = at_birth(chain.table, -_variation(chain) / mean[..., 0])
    return Partials(dx=by.dx, ax=by.ax, ex=by_mean)


FAMILY = (
    deviation(
        0,
        label="Standard deviation of age at death",
        definition=(
            "How far ages at death would lie from their average, as the root of the mean squared"
            " distance, if the death rates of the year held for all lives. Deaths of children, far"
            " from the average, count much."
        ),
        source="Wilmoth & Horiuchi (1999), Rectangularization revisited, Demography 36, 475-495",
    ),
    deviation(
        10,
        label="Standard deviation of age at death, from 10",
        definition=(
            "How far the ages at death of those who have reached 10 would lie from their average,"
            " as the root of the mean squared distance, if the death rates of the year held for the"
            " rest of their lives."
        ),
        source=(
            "Edwards & Tuljapurkar (2005), Inequality in life spans and a new perspective on"
            " mortality convergence across industrialized countries, Population and Development"
            " Review 31, 645-674"
        ),
    ),
    Indicator(
        key="cv",
        symbol="CV",
        label="Coefficient of variation of age at death",
        unit=RATIO,
        definition=(
            "The standard deviation of age at death as a part of life expectancy at birth: 0 if all"
            " died at one age, 1 if the death rate were the same at all ages."
            f" {WHERE_DEATHS_STAND} Groups of five years move it by up to 0.0005."
        ),
        formula="CV = s0 / e(0)",
        source=(
            "van Raalte & Caswell (2013), Perturbation analysis of indices of lifespan variability,"
            " Demography 50, 1615-1640"
        ),
        why_not_smooth="",
        needs=Needs(open_deaths=True, open_small=True),
        value=_variation,
        partials=_variation_partials,
    ),
)
