"""Multiple decrement tables: of what those born would die, and when."""

import numpy as np

from engine.causes.number import CauseNumber
from engine.causes.parting import Parted, Slopes, cause_first
from engine.estimates import Reason
from engine.indicator import Needs, Unit
from engine.standardisation import LEAST_DEATHS
from engine.tables import Partials

CHANCE = Unit("per_100_births", "per 100 births", 100, 1, limits="part")
AGE = Unit("age", "years", 1, 1)

SOURCE = (
    "Chiang (1968), Introduction to Stochastic Processes in Biostatistics, chapter 11; Preston,"
    " Heuveline & Guillot (2001), Demography, chapter 4"
)


def chance_before(age: int | None) -> CauseNumber:
    """The chance of a newborn child to die of the cause before an exact age; None: at any age."""

    def read(parted: Parted) -> Slopes:
        table = parted.chain.table
        inside = np.full(len(table.grid), True)
        if age is not None:
            inside = np.array(table.grid.starts) < age
        Lx, mx = np.where(inside, table.Lx, 0.0), np.where(inside, parted.mx, 0.0)
        value = (mx * Lx).sum(axis=-1)
        if age is not None and not table.grid.has(age):
            value = np.full_like(value, np.nan)
        return Slopes(value, Partials(Lx=mx), np.broadcast_to(Lx, mx.shape))

    span = "" if age is None else f" before {age}"
    return CauseNumber(
        key="chance" if age is None else f"chance{age}",
        symbol="Q" if age is None else f"Q{age}",
        label=f"Chance of dying of it{span}",
        unit=CHANCE,
        definition=(
            f"How many of a hundred children born would die of the cause{span} if the death rates"
            f" of the year, of this and of all other causes, held for all their lives."
        ),
        formula=f"sum of d(x) m_i(x) / m(x) over all ages{span}, births taken as 100",
        source=SOURCE,
        needs=Needs(open_deaths=True) if age is None else Needs(ages=(age,)),
        adds_up=True,
        read=read,
    )


def _mean_age(parted: Parted) -> Slopes:
    table = parted.chain.table
    dx, age = parted.mx * table.Lx, np.array(table.grid.starts, float) + table.ax
    total, counted = dx.sum(axis=-1), cause_first(parted.causes.counts).sum(axis=-1)
    enough = np.real(counted) >= LEAST_DEATHS
    value = np.where(enough, (dx * age).sum(axis=-1) / total, np.nan)
    per = 1 / np.where(enough, total, np.nan)[..., None]
    later = (age - value[..., None]) * per
    return Slopes(value, Partials(Lx=parted.mx * later, ax=dx * per), table.Lx * later)


MEAN_AGE = CauseNumber(
    key="mean_age",
    symbol="A",
    label="Mean age at death",
    unit=AGE,
    definition=(
        "The mean age at which those of the life table who die of the cause do so: the death rates"
        " of the year are taken, not the ages of the people there are. Within an age group deaths"
        f" of every cause lie like those of all. With fewer than {LEAST_DEATHS} deaths there is no"
        f" mean age."
    ),
    formula=(
        "sum of d_i(x) (x + a(x)) / sum of d_i(x), d_i(x) the deaths of the table of the cause,"
        " a(x) of the open group the life expectancy there"
    ),
    source=SOURCE,
    needs=Needs(open_deaths=True, otherwise=Reason.TOO_FEW_DEATHS),
    adds_up=False,
    read=_mean_age,
)
LIFETIME, BEFORE_75 = chance_before(None), chance_before(75)
FAMILY = (LIFETIME, BEFORE_75, MEAN_AGE)
