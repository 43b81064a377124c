"""Life tables as they would be with fewer deaths of one cause, or none, all others as they are."""

from dataclasses import dataclass

import numpy as np

from engine.ages import Array
from engine.causes.number import CauseNumber
from engine.causes.parting import Parted, Slopes
from engine.causes.remaining import LAWS, Left, Lived, lived
from engine.estimates import Reason
from engine.indicator import Needs
from engine.indicators.expectancy import YEARS
from engine.tables import LifeTable, Partials, from_rates, pull


@dataclass(frozen=True, slots=True)
class Deleted:
    """The tables with a part of each cause taken away, [cause, ..., age]."""

    table: LifeTable
    share: Array  # left of all deaths at the age
    left: Left
    lived: Lived


def deleted(parted: Parted, *, part: float = 1.0, law: str = "constant_ratio") -> Deleted:
    """The life table of each cause by itself with that part of its deaths taken away, as if those
    saved went on to die at the rates of the others of their age.

    Of the closed groups q' is that of `law` (`engine.causes.remaining`), a' as `lived` says; the
    open group is left after a / R years on average, its rate being that part of what it was.

    Shape:   -> [cause, ..., age] on the grid of the chain's table.
    Missing: nan where the table is; ex where nothing is left of the deaths of the open group.
    Raises:  ValueError where part is not between 0 and 1, or the law is not named.
    Source:  Chiang (1968), Introduction to Stochastic Processes in Biostatistics, chapter 11;
             Preston, Heuveline & Guillot (2001), Demography, chapter 4.
    """
    if not 0 <= part <= 1:
        raise ValueError(f"a part of {part:g} cannot be taken away; it lies between 0 and 1")
    if law not in LAWS:
        raise ValueError(f"no law of deletion is named {law!r}; the names are {', '.join(LAWS)}")
    table = parted.chain.table
    share = 1 - part * parted.share
    with np.errstate(all="ignore"):
        closed = share[..., :-1]
        left = LAWS[law](np.broadcast_to(table.qx[..., :-1], closed.shape), closed)
        inside = lived(parted.chain, left, closed)
        n = table.grid.widths[:-1]
        rates = left.value / (n - (n - inside.ax) * left.value)
        last = np.where(np.real(share[..., -1:]) > 0, table.ax[..., -1:] / share[..., -1:], np.nan)
        mx = np.concatenate([rates, 1 / last], axis=-1)
    made = from_rates(table.grid, mx, np.concatenate([inside.ax, last], axis=-1))
    return Deleted(made, share, left, inside)


def gain(*, part: float = 1.0, law: str = "constant_ratio") -> CauseNumber:
    """What life expectancy at birth would gain with that part of the deaths of a cause away."""

    def read(parted: Parted) -> Slopes:
        found = deleted(parted, part=part, law=law)
        value = found.table.ex[..., 0] - parted.chain.table.ex[..., 0]
        return _slopes(parted, found, part, value)

    away = "were absent" if part == 1 else f"were {100 * part:g} % fewer at every age"
    return CauseNumber(
        key=f"gain{'' if part == 1 else f'_{100 * part:g}'}{NAMES[law]}",
        symbol="gain",
        label=f"Gain in life expectancy if it {away}{OF_LAW[law]}",
        unit=YEARS,
        definition=(
            f"The years that life expectancy at birth would be longer if deaths of the cause {away}"
            " and the death rates of all other causes stayed as they are. Those saved go on to die"
            " of the others at their rates, as if the causes had nothing to do with one another."
            " Gains do not add up: taken together they would be more or less than the sum. It is"
            f" arithmetic, no forecast of what can be done. {ASSUMES[law]}"
        ),
        formula=f"e(0) of the table with {FORMULAS[law]}, R the share of deaths left, less e(0)",
        source=SOURCES[law],
        needs=Needs(open_deaths=True, otherwise=Reason.NO_DEATHS_IN_OPEN_GROUP),
        adds_up=False,
        read=read,
    )


def _slopes(parted: Parted, found: Deleted, part: float, value: Array) -> Slopes:
    """Derivatives of the deleted table's e(0) less those of e(0), by the columns there were and by
    the cause's rate."""
    table, new = parted.chain.table, found.table
    n, first = table.grid.widths[:-1], (np.array(table.grid.starts) == 0).astype(float)
    g = pull(new, Partials(ex=np.broadcast_to(first, new.ex.shape)))
    m, a = (column[..., :-1] for column in (table.mx, table.ax))
    m_left, a_left = (column[..., :-1] for column in (new.mx, new.ax))
    # of what is left: by q' at a' held, and by a' at q' held
    by_q = g.mx[..., :-1] * (1 + (n - a_left) * m_left) ** 2 / n
    by_a = g.ax[..., :-1] - g.mx[..., :-1] * m_left**2
    left, years = found.left, found.lived
    by_q = by_q + by_a * years.by_left
    q_there = by_q * left.by_all + by_a * years.by_qx
    a_there = by_a * years.by_ax
    by_share = by_q * left.by_share + by_a * years.by_share
    open_share = found.share[..., -1:]
    open_a = np.broadcast_to(table.ax[..., -1:], open_share.shape)
    per = (1 + (n - a) * m) ** 2
    by_mx = q_there * n / per
    by_ax = np.concatenate(
        [a_there + q_there * n * m**2 / per, g.ax[..., -1:] / open_share], axis=-1
    )
    shares = np.concatenate([by_share, -g.ax[..., -1:] * open_a / open_share**2], axis=-1)
    # by q' the share counts for nothing where nobody dies, but a first death would be of the cause
    first_death = np.concatenate([by_q * n, np.zeros_like(open_a)], axis=-1)
    with np.errstate(all="ignore"):
        per_rate = np.where(np.real(table.mx) > 0, shares / table.mx, first_death)
    own = -part * per_rate
    by_mx = np.concatenate([by_mx, np.zeros_like(open_a)], axis=-1) - own * parted.share
    return Slopes(value, Partials(mx=by_mx, ax=by_ax, ex=-first), own)


NAMES = {"constant_ratio": "", "uniform": "_uniform"}
OF_LAW = {"constant_ratio": "", "uniform": ", deaths lying evenly"}
FORMULAS = {
    "constant_ratio": "p(x)^R in place of p(x)",
    "uniform": "q'(x) = b - sqrt(b^2 - 2 R q(x)), b = 1 - (1/2 - R) q(x), in place of q(x)",
}
ASSUMES = {
    "constant_ratio": (
        "Within an age group the causes keep their shares; those left die after as many years in"
        " the group as before, nearly."
    ),
    "uniform": "Within an age group deaths of the cause and of all others would each lie evenly.",
}
SOURCES = {
    "constant_ratio": (
        "Chiang (1968), Introduction to Stochastic Processes in Biostatistics, chapter 11;"
        " Preston, Heuveline & Guillot (2001), Demography, chapter 4 (years lived in the group)"
    ),
    "uniform": (
        "Bowers, Gerber, Hickman, Jones & Nesbitt (1997), Actuarial Mathematics, chapter 10"
    ),
}
GAIN, GAIN_UNIFORM = gain(), gain(law="uniform")
FAMILY = (GAIN, GAIN_UNIFORM)
