"""Ages that a given part of those born live to see, and how far they lie apart."""

from collections.abc import Callable

import numpy as np

from engine.ages import Array
from engine.chain import Chain
from engine.estimates import Reason
from engine.indicator import Indicator, Needs
from engine.indicators.expectancy import YEARS
from engine.tables import LifeTable

EVENLY = "Inside an age group the survivors are taken to fall evenly."
QUARTERS = "Groups of five years move it by up to a quarter of a year."


def ages_at(table: LifeTable, reach: Array) -> Array:
    """The first ages at which survivors are as many as `reach`, falling evenly inside a group.

    Shape:   reach [..., number] -> [..., number].
    Missing: nan where they are so few in the open group only, and where lx is nan about there.
    """
    lx, starts = np.real(table.lx), np.array(table.grid.starts, float)
    group = np.zeros(reach.shape, int)
    for x in range(1, len(starts)):
        group += lx[..., x, None] > reach
    closed = group < len(starts) - 1
    group = np.where(closed, group, 0)
    with np.errstate(all="ignore"):
        above, below = (np.take_along_axis(lx, at, axis=-1) for at in (group, group + 1))
        fallen = (above - reach) / (above - below)
        return np.where(closed, starts[group] + table.grid.widths[group] * fallen, np.nan)


def _seen_by(share: float) -> Callable[[Chain], Array]:
    def value(chain: Chain) -> Array:
        lx = chain.table.lx
        return ages_at(chain.table, np.full((*lx.shape[:-1], 1), share))[..., 0]

    return value


_lower, _median, _upper = _seen_by(0.75), _seen_by(0.5), _seen_by(0.25)


def _range(chain: Chain) -> Array:
    return _upper(chain) - _lower(chain)


def _shortest(chain: Chain) -> Array:
    """Deaths per year of age are level inside a group, so that one of the shortest spans begins or
    ends where a group begins: twice as many spans as groups are looked at."""
    table = chain.table
    starts, lx = np.array(table.grid.starts, float), np.real(table.lx)
    begun = np.where(lx >= 0.5, ages_at(table, lx - 0.5) - starts, np.nan)
    ended = np.where(lx <= 0.5, starts - ages_at(table, lx + 0.5), np.nan)
    spans = np.concatenate([begun, ended], axis=-1)
    shortest = np.where(np.isnan(spans), np.inf, spans).min(axis=-1)
    known = np.isfinite(shortest) & np.isfinite(lx).all(axis=-1)
    return np.where(known, shortest, np.nan)


LINEAR = (
    "linear l(x) inside a group as in Preston, Heuveline & Guillot (2001), Demography, chapter 3"
)
WILMOTH = "Wilmoth & Horiuchi (1999), Rectangularization revisited, Demography 36, 475-495"
KNOWN_AT_ENDS = (
    "It is read off survivors that are known at the ends of age groups only, and its slope"
    " jumps where it passes from one group into the next."
)
SMALL = Needs(open_small=True, otherwise=Reason.OPEN_GROUP_TOO_LARGE)

FAMILY = (
    Indicator(
        key="lower_quartile",
        symbol="Q1",
        label="Lower quartile of age at death",
        unit=YEARS,
        definition=(
            "The age that three quarters of those born would live to see, while one quarter would"
            f" not, if the death rates of the year held for all their lives. {EVENLY} {QUARTERS}"
        ),
        formula="Q1 = x + n (l(x) - 3/4) / d(x), x to x+n the group with l(x) > 3/4 >= l(x+n)",
        source=f"{WILMOTH}; {LINEAR}",
        why_not_smooth=KNOWN_AT_ENDS,
        needs=Needs(otherwise=Reason.OPEN_GROUP_TOO_LARGE),
        value=_lower,
    ),
    Indicator(
        key="median",
        symbol="Me",
        label="Life-table median",
        unit=YEARS,
        definition=(
            "The age that half of those born would live to see if the death rates of the year held"
            f" for all their lives. {EVENLY}"
        ),
        formula="Me = x + n (l(x) - 1/2) / d(x), x to x+n the group with l(x) > 1/2 >= l(x+n)",
        source=(
            "Canudas-Romo (2010), Three measures of longevity, Demography 47, 299-312; " + LINEAR
        ),
        why_not_smooth=KNOWN_AT_ENDS,
        needs=Needs(otherwise=Reason.OPEN_GROUP_TOO_LARGE),
        value=_median,
    ),
    Indicator(
        key="upper_quartile",
        symbol="Q3",
        label="Upper quartile of age at death",
        unit=YEARS,
        definition=(
            "The age that one quarter of those born would live to see if the death rates of the"
            f" year held for all their lives. {EVENLY} {QUARTERS}"
        ),
        formula="Q3 = x + n (l(x) - 1/4) / d(x), x to x+n the group with l(x) > 1/4 >= l(x+n)",
        source=f"{WILMOTH}; {LINEAR}",
        why_not_smooth=KNOWN_AT_ENDS,
        needs=SMALL,
        value=_upper,
    ),
    Indicator(
        key="iqr",
        symbol="IQR",
        label="Interquartile range of age at death",
        unit=YEARS,
        definition=(
            "The years between the age that three quarters of those born would live to see and the"
            " age that one quarter would, if the death rates of the year held for all their lives:"
            f" the middle half of deaths falls between the two. {EVENLY} Groups of five years move"
            " it by up to 0.4."
        ),
        formula="IQR = Q3 - Q1",
        source=f"{WILMOTH}; {LINEAR}",
        why_not_smooth=KNOWN_AT_ENDS,
        needs=SMALL,
        value=_range,
    ),
    Indicator(
        key="shortest_half",
        symbol="C50",
        label="Shortest span of ages with half of deaths",
        unit=YEARS,
        definition=(
            "The fewest years of age into which half of the deaths would fall if the death rates"
            " of the year held for all lives: the shorter, the more deaths are drawn together."
            " Inside an age group deaths are taken to fall evenly. Groups of five years move it by"
            " up to half a year."
        ),
        formula=(
            "C50 = the least y - x with l(x) - l(y) = 1/2, y at most the open age, l(x) linear"
            " inside each group"
        ),
        source=(
            "Kannisto (2000), Measuring the compression of mortality, Demographic Research 3,"
            " article 6"
        ),
        why_not_smooth=(
            "It jumps in slope where an end of the span passes from one age group into the next,"
            " and another span can become the shortest."
        ),
        needs=SMALL,
        value=_shortest,
    ),
)
