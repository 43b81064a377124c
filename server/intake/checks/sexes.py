"""Checks of women against men: how many they are, how many die, at which rates."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from engine.ages import Array
from server.intake.cells import Flags, Ints, parts_of
from server.intake.checks.check import Check, several
from server.intake.ledger import Ledger
from server.intake.problems import Fault, Text, Value
from server.intake.rated import Rated, rated

SURE = 5.0  # standard deviations of chance in deaths, which are taken as twice as uneven as Poisson
UNEVEN = 2.0
FEW = 100  # deaths of either sex under which nothing is said


@dataclass(frozen=True, slots=True)
class Range:
    """Men over women, as usual; and how many times that of the other areas it may be."""

    low: float
    high: float
    times: float


PEOPLE = Range(0.75, 1.35, 1.35)
DEATHS = Range(0.70, 1.70, 1.50)
RATES = Range(0.95, 2.50, 1.50)
RATES_AT_AN_AGE = Range(0.70, 6.00, 2.00)
ADULT = (15, 80)  # ages at which rates of the sexes are set side by side


def _sexes(ledger: Ledger) -> Iterator[tuple[Rated, Ints, Ints]]:
    """Lines of women and of men of the same areas and years."""
    for one in rated(ledger, parts=True):
        women, men = one.couples()
        if len(women):
            yield one, women, men


@dataclass(frozen=True, slots=True)
class Odd:
    """Ratios, which of them are off, and the middle one of all areas; nan where there are few."""

    ratio: Array  # [line, ...]
    off: Flags
    middle: Array

    def values(self, at: int, usual: Range) -> dict[str, Value]:
        """One of them (as numbered in one row), and between which it is expected."""
        middle, low, high = float(self.middle.flat[at]), usual.low, usual.high
        if np.isfinite(middle):
            low, high = max(low, middle / usual.times), min(high, middle * usual.times)
        ratio = float(self.ratio.flat[at])
        return {"ratio": round(ratio, 2), "low": round(low, 2), "high": round(high, 2)}


def _odd(ratio: Array, spread: Array, area: Ints, usual: Range) -> Odd:
    """Ratios out of the usual range, or with three areas and more too far from the middle one."""
    with np.errstate(all="ignore"):
        log = np.log(ratio)
        beyond = np.maximum(log - np.log(usual.high), np.log(usual.low) - log)
        off = beyond > SURE * spread
        middle = np.full(ratio.shape, np.nan)
        if len(np.unique(area)) > 2:
            middle = np.broadcast_to(_middle(ratio), ratio.shape)
            apart = np.abs(log - np.log(middle)) - np.log(usual.times)
            off |= apart > SURE * spread
    return Odd(ratio, np.asarray(off), middle)


def _middle(ratio: Array) -> Array:
    """Median over the lines, gaps left out; nan where there are only gaps."""
    ordered = np.sort(ratio, axis=0)
    at = np.maximum(np.sum(~np.isnan(ordered), axis=0) - 1, 0) // 2
    return np.asarray(np.take_along_axis(ordered, np.asarray(at)[None], axis=0)[0])


def _of_counts(ledger: Ledger, *, deaths: bool) -> Iterator[Fault]:
    usual = DEATHS if deaths else PEOPLE
    for one, women, men in _sexes(ledger):
        counts = (one.deaths if deaths else one.people).sum(axis=-1)
        few = np.minimum(counts[women], counts[men]) < (FEW if deaths else 1_000)
        with np.errstate(all="ignore"):
            ratio = np.where(few, np.nan, counts[men] / counts[women])
            spread = np.sqrt(UNEVEN * (1 / counts[men] + 1 / counts[women]))
        odd = _by_year(one, men, ratio, spread, usual)

        def fault(at: int, one: Rated = one, men: Ints = men, of: Odd = odd) -> Fault:
            return one.fault(ledger, int(men[at]), 0, of.values(at, usual))

        yield from several(np.flatnonzero(odd.off), fault)


def _by_year(one: Rated, lines: Ints, ratio: Array, spread: Array, usual: Range) -> Odd:
    """As `_odd`, each year among its own areas."""
    area, _, year = parts_of(one.place[lines])
    off, middle = np.zeros(len(lines), bool), np.full(len(lines), np.nan)
    years, which, size = np.unique(year, return_inverse=True, return_counts=True)
    order = np.argsort(which, kind="stable")
    for here in np.split(order, np.cumsum(size)[:-1]) if len(years) else []:
        found = _odd(ratio[here], spread[here], area[here], usual)
        off[here], middle[here] = found.off, found.middle
    return Odd(ratio, off, middle)


def _of_rates(ledger: Ledger) -> Iterator[Fault]:
    """Men's deaths over those that women's rates would give them, and the same at each age, over
    all years together."""
    for yearly, _, _ in _sexes(ledger):
        one = yearly.pooled()
        women, men = one.couples()
        area = parts_of(one.place[men])[0]
        adult = np.flatnonzero((one.starts >= ADULT[0]) & (one.starts < ADULT[1]))
        with np.errstate(all="ignore"):
            expected = one.people[men] * one.rates[women]
            enough = np.minimum(one.deaths[women], one.deaths[men])[:, adult] >= FEW
            spread = np.sqrt(UNEVEN * (1 / one.deaths[men] + 1 / one.deaths[women]))[:, adult]
            by_age = np.where(enough, (one.deaths[men] / expected)[:, adult], np.nan)
            known = np.isfinite(expected)
            died = np.where(known, one.deaths[men], 0).sum(axis=-1)
            met = np.where(known, one.deaths[women], 0).sum(axis=-1)
            ratio = died / np.where(known, expected, 0).sum(axis=-1)
            ratio = np.where(np.minimum(died, met) >= FEW, ratio, np.nan)
            chance = np.sqrt(UNEVEN * (1 / died + 1 / met))
        together = _odd(ratio, chance, area, RATES)
        apart = _odd(by_age, spread, area, RATES_AT_AN_AGE)
        apart.off[together.off] = False  # said already

        def of_all(at: int, one: Rated = one, men: Ints = men, odd: Odd = together) -> Fault:
            label: dict[str, Value] = {"age": Text("all ages")}
            return one.fault(ledger, int(men[at]), 0, label | odd.values(at, RATES))

        def of_one(
            at: int, one: Rated = one, men: Ints = men, adult: Ints = adult, odd: Odd = apart
        ) -> Fault:
            line, column = divmod(at, len(adult))
            age = int(adult[column])
            label: dict[str, Value] = {"age": one.grid.labels[age]}
            return one.fault(ledger, int(men[line]), age, label | odd.values(at, RATES_AT_AN_AGE))

        yield from several(np.flatnonzero(together.off), of_all)
        yield from several(np.flatnonzero(apart.off), of_one)


CHECKS: tuple[Check[Ledger], ...] = (
    Check(
        key="sex_ratio_of_population",
        severity="warning",
        meaning="Men are fewer than 75 or more than 135 for each 100 women, or their ratio to "
        "women is more than a third off that of the other areas of the year, beyond chance.",
        why="A sex left out in part, two columns exchanged or camps and barracks counted with one "
        "area show in how many men there are to each woman.",
        found="{ratio} men to each woman in {area}, {year}",
        expected="{low} to {high}",
        remedy="Compare both sexes with their source. Say in the note what draws one sex there.",
        source="Shryock & Siegel (1971), The Methods and Materials of Demography, ch. 7; the "
        "limits are Ebbline's own.",
        find=lambda ledger: _of_counts(ledger, deaths=False),
    ),
    Check(
        key="sex_ratio_of_deaths",
        severity="warning",
        meaning="Deaths of men are fewer than 70 or more than 170 for each 100 of women, or their "
        "ratio is more than one and a half times off that of the other areas, beyond chance.",
        why="Deaths of one sex that are registered in part, or filed under the other, change this "
        "ratio before any other figure.",
        found="{ratio} deaths of men to each of a woman in {area}, {year}",
        expected="{low} to {high}",
        remedy="Compare both sexes with their source; look whether they were exchanged.",
        source="Shryock & Siegel (1971), The Methods and Materials of Demography, ch. 14; the "
        "limits are Ebbline's own.",
        find=lambda ledger: _of_counts(ledger, deaths=True),
    ),
    Check(
        key="sex_ratio_of_rates",
        severity="warning",
        meaning="At the death rates of women, more men would have died than did, or fewer than "
        "two in five of those who did; or at one age the rates of the sexes lie further apart "
        "than anywhere usual, or than in the other areas. All years are taken together.",
        why="Nearly everywhere men die at higher rates than women at every age. The opposite is "
        "most often two columns exchanged, or a population that does not belong to the deaths.",
        found="a death rate of men {ratio} times that of women in {area}, {year}, age {age}",
        expected="{low} to {high}",
        remedy="Look whether the sexes were exchanged in one of the two counts.",
        source="Preston (1976), Mortality Patterns in National Populations, ch. 6; the limits are "
        "Ebbline's own.",
        find=_of_rates,
    ),
)
