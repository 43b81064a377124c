"""Checks of whether all deaths were registered, and the same share of them in every year."""

from collections.abc import Iterator

import numpy as np

from engine.ages import Array
from engine.panel import SEXES
from engine.quality import growth_balance
from server.intake.cells import YEARS, Ints, parts_of
from server.intake.checks.check import Check, several
from server.intake.ledger import Ledger
from server.intake.problems import Fault, Value
from server.intake.rated import Rated, rated

YEARLY = 0.05  # change of the crude death rate that nothing but counting brings about for years
LEAST_YEARS, MOST_YEARS = 4, 10
SHARE = (0.85, 1.18)
ENOUGH = 50_000  # people of a sex
SURE = 5.0


def _drift(ledger: Ledger) -> Iterator[Fault]:
    """Areas and sexes whose deaths per head rise or fall for years faster than mortality can."""
    for one in rated(ledger, parts=True):
        pooled = one.pooled()
        begins, counts = pooled.first, pooled.years
        series = np.repeat(np.arange(len(begins)), counts)
        year = (one.place % YEARS).astype(float)
        died, people = one.deaths.sum(axis=-1), one.people.sum(axis=-1)
        with np.errstate(all="ignore"):
            log = np.log(died / people)
            weight = np.where(np.isfinite(log), died, 0.0)
        log = np.where(weight > 0, log, 0.0)

        def total(values: Array, series: Ints = series, lines: int = len(begins)) -> Array:
            return np.bincount(series, values, lines).astype(np.float64)

        with np.errstate(all="ignore"):
            mid, level = total(weight * year) / total(weight), total(weight * log) / total(weight)
            away = year - mid[series]
            square = total(weight * away**2)
            slope = total(weight * away * (log - level[series])) / square
            rest = log - level[series] - slope[series] * away
            uneven = np.maximum(total(weight * rest**2) / np.maximum(counts - 2, 1), 1.0)
            sure = np.abs(slope) - YEARLY > 2 * np.sqrt(uneven / square)

        def fault(at: int, pooled: Rated = pooled, slope: Array = slope) -> Fault:
            values: dict[str, Value] = {"percent": round(100 * float(np.expm1(slope[at])), 1)}
            return pooled.fault(ledger, at, 0, values)

        yield from several(np.flatnonzero(sure & (counts >= LEAST_YEARS)), fault)


def _share(ledger: Ledger) -> Iterator[Fault]:
    """Share of the deaths of all areas together that were registered, by sex."""
    for one in rated(ledger, parts=True):
        _, sex, year = parts_of(one.place)
        for code in range(len(SEXES)):
            lines = np.flatnonzero(sex == code)
            years = _complete(year[lines])
            if len(years) <= LEAST_YEARS or not len(lines):
                continue
            deaths, people = (
                np.array([counts[lines[year[lines] == y]].sum(axis=0) for y in years])
                for counts in (one.deaths, one.people)
            )
            if people.sum(axis=-1).min() < ENOUGH:
                continue
            share = registered_share(one, deaths, people, years)
            if not SHARE[0] <= share <= SHARE[1] and np.isfinite(share):
                values: dict[str, Value] = {
                    "percent": round(100 * share),
                    "sexes": SEXES[code],
                    "years": f"{years[0]}–{years[-1]}",
                }
                yield one.block.fault(one.block.row[lines], values)


def _complete(year: Ints) -> Ints:
    """The last years in a row in which as many areas are at hand as in any, eleven at most."""
    years, areas = np.unique(year, return_counts=True)
    years = years[areas == areas.max()] if len(years) else years
    if not len(years):
        return years
    breaks = np.flatnonzero(np.diff(years) > 1)
    return years[breaks[-1] + 1 if len(breaks) else 0 :][-MOST_YEARS - 1 :]


def registered_share(one: Rated, deaths: Array, people: Array, years: Ints) -> float:
    """By the general growth balance, from the middle of the first year to that of the last."""
    between = deaths.sum(axis=0) - (deaths[0] + deaths[-1]) / 2
    span = np.array(float(years[-1] - years[0]))
    return float(growth_balance(one.grid, people[0], people[-1], between, span))


CHECKS: tuple[Check[Ledger], ...] = (
    Check(
        key="deaths_drift",
        severity="warning",
        meaning="Deaths per head rise or fall by more than 5 % a year over four years or more, "
        "beyond what the years differ anyway.",
        why="Mortality and age structure move by a per cent or two a year. What moves faster for "
        "years is the counting: registration that spreads, or that lapses.",
        found="deaths per head changing by {percent} % a year in {area}, {sex} {year}",
        expected="at most 5 % a year, up or down",
        remedy="Ask when registration was changed or extended; use the years in which it was "
        "complete, and mark a break.",
        source="United Nations (2014), Principles and Recommendations for a Vital Statistics "
        "System, Revision 3, part 3; the limit is Ebbline's own.",
        find=_drift,
    ),
    Check(
        key="registered_share",
        severity="warning",
        meaning="By the general growth balance fewer than 85 or more than 118 of 100 deaths from "
        "age 30 on were registered in all areas together, over the last five to eleven years.",
        why="Deaths and the ageing of the population must fit: who is missing from one age group "
        "and not in the next has died or moved. Where few move, this measures registration.",
        found="{percent} of 100 deaths registered, {sexes}, {years}",
        expected="about 100, from 85 to 118",
        remedy="Compare with another source of deaths; where many move in or out, say so in the "
        "note.",
        source="Hill (1987), Asian and Pacific Population Forum 1(3), 8-13 and 23-24; the limits "
        "are Ebbline's own.",
        find=_share,
    ),
)
