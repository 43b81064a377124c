"""Checks of death rates by age: the first years, and the ages at which errors of age show."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from engine.ages import Array
from server.intake.cells import Flags, Ints
from server.intake.checks.check import Check, several
from server.intake.checks.sexes import FEW, SURE, UNEVEN
from server.intake.ledger import Ledger
from server.intake.problems import Fault, Value
from server.intake.rated import Rated, rated

OLD = 60  # from here on death rates rise with every year of age, everywhere
FALLS = 2.8  # standard deviations below no rise at all
SPIKE, ROUND_FROM = 0.05, 40
MIDDLE, OLDEST = (60, 80), 85
CROSSES = (1.10, 0.95)  # higher than the other in the middle ages, lower at the oldest
SHARE = (0.50, 0.96)  # of infants among those who die under five


def pooled(ledger: Ledger) -> Iterator[Rated]:
    for one in rated(ledger, parts=True):
        yield one.pooled()


def _falls(ledger: Ledger) -> Iterator[Fault]:
    for one in pooled(ledger):
        with np.errstate(all="ignore"):
            step = np.diff(np.log(one.rates), axis=-1)
            spread = np.sqrt(1 / one.deaths[:, 1:] + 1 / one.deaths[:, :-1])
        enough = np.minimum(one.deaths[:, 1:], one.deaths[:, :-1]) >= FEW
        falls = enough & (step < -FALLS * spread) & (one.starts[1:] > OLD)

        def fault(at: int, one: Rated = one) -> Fault:
            line, age = divmod(at, len(one.grid) - 1)
            return one.fault(ledger, line, age + 1, _two_rates(one, line, age + 1, age))

        yield from several(np.flatnonzero(falls), fault)


def _two_rates(one: Rated, line: int, age: int, other: int) -> dict[str, Value]:
    """Rates per 1,000 at an age and at another one, or its neighbours."""
    return {
        "age": one.grid.labels[age],
        "rate": round(1000 * float(one.rates[line, age]), 1),
        "other": round(1000 * float(one.rates[line, other]), 1),
        "before": one.grid.labels[other],
    }


def _spikes(ledger: Ledger) -> Iterator[Fault]:
    for one in pooled(ledger):
        starts = one.starts
        single = (starts[1:-1] - starts[:-2] == 1) & (starts[2:] - starts[1:-1] == 1)
        single[-1:] = False  # beside the open group no year is compared
        at = 1 + np.flatnonzero(single & (starts[1:-1] % 5 == 0) & (starts[1:-1] >= ROUND_FROM))
        if not len(at):
            continue
        with np.errstate(all="ignore"):
            log = np.log(one.rates)
            usual = np.exp((log[:, at - 1] + log[:, at + 1]) / 2)
            over = log[:, at] - np.log(usual)
            spread = np.sqrt(
                1 / one.deaths[:, at] + (1 / one.deaths[:, at - 1] + 1 / one.deaths[:, at + 1]) / 4
            )
        enough = np.minimum(
            np.minimum(one.deaths[:, at - 1], one.deaths[:, at + 1]), one.deaths[:, at]
        )
        spikes = (enough >= FEW) & (over > SPIKE) & (over > SURE * spread)

        def fault(number: int, one: Rated = one, ages: Ints = at, usual: Array = usual) -> Fault:
            line, column = divmod(number, len(ages))
            age = int(ages[column])
            between: dict[str, Value] = {"other": round(1000 * float(usual[line, column]), 1)}
            return one.fault(ledger, line, age, _two_rates(one, line, age, age) | between)

        yield from several(np.flatnonzero(spikes), fault)


def _ratio(one: Rated, these: Ints, those: Ints, ages: Flags) -> tuple[Array, Array]:
    """Deaths of some lines at some ages over those that others' rates would give them, and the
    standard deviation of its logarithm."""
    with np.errstate(all="ignore"):
        expected = np.where(ages, one.people[these] * one.rates[those], 0).sum(axis=-1)
        died = np.where(ages, one.deaths[these], 0).sum(axis=-1)
        met = np.where(ages, one.deaths[those], 0).sum(axis=-1)
        spread = np.sqrt(UNEVEN * (1 / died + 1 / met))
        ratio = np.where(np.minimum(died, met) >= FEW, died / expected, np.nan)
    return ratio, spread


@dataclass(frozen=True, slots=True)
class Crossing:
    """Rates over those set beside them, in the middle ages and at the oldest, and where the one
    turns into the other beyond chance."""

    young: Array  # [line]
    old: Array
    at: Ints


def _crossed(one: Rated, these: Ints, those: Ints) -> Crossing:
    middle = (one.starts >= MIDDLE[0]) & (one.starts < MIDDLE[1])
    young, spread_young = _ratio(one, these, those, middle)
    old, spread_old = _ratio(one, these, those, one.starts >= OLDEST)
    with np.errstate(all="ignore"):
        higher = np.log(young / CROSSES[0]) > SURE * spread_young
        lower = np.log(CROSSES[1] / old) > SURE * spread_old
    return Crossing(young, old, np.flatnonzero(higher & lower))


def _sexes_cross(ledger: Ledger) -> Iterator[Fault]:
    for one in pooled(ledger):
        women, men = one.couples()
        yield from _crossings(ledger, one, men, _crossed(one, men, women))


def _areas_cross(ledger: Ledger) -> Iterator[Fault]:
    """Each area against all others of its sex."""
    for one in pooled(ledger):
        for sex in "fmp":
            lines = one.of(sex)
            if len(lines) < 2:
                continue
            rest = others(one, lines)
            both = np.arange(len(lines))
            found = _crossed(rest, both, both + len(lines))
            yield from _crossings(ledger, one, lines, found)


def others(one: Rated, lines: Ints) -> Rated:
    """These lines, and then for each the sum of the others."""
    deaths, people = one.deaths[lines], one.people[lines]
    return Rated(
        one.grid,
        np.concatenate([one.place[lines]] * 2),
        np.concatenate([deaths, deaths.sum(axis=0) - deaths]),
        np.concatenate([people, people.sum(axis=0) - people]),
        np.concatenate([one.first[lines]] * 2),
        one.block,
        np.concatenate([one.years[lines]] * 2),
    )


def _crossings(ledger: Ledger, one: Rated, lines: Ints, found: Crossing) -> Iterator[Fault]:
    age = min(int(np.searchsorted(one.starts, OLDEST)), len(one.grid) - 1)

    def fault(at: int) -> Fault:
        values: dict[str, Value] = {
            "young": round(float(found.young[at]), 2),
            "old": round(float(found.old[at]), 2),
        }
        return one.fault(ledger, int(lines[at]), age, values)

    yield from several(found.at, fault)


def _infant_share(ledger: Ledger) -> Iterator[Fault]:
    for one in pooled(ledger):
        if not (one.grid.has(1) and one.grid.has(5)):
            continue
        infants = one.deaths[:, 0]
        under = one.deaths[:, : one.grid.position(5)].sum(axis=-1)
        with np.errstate(all="ignore"):
            share = infants / under
            spread = np.sqrt(UNEVEN * 0.05 / under)
        low, high = SHARE
        off = (share < low - SURE * spread) | (share > high + SURE * spread)

        def fault(line: int, one: Rated = one, share: Array = share) -> Fault:
            return one.fault(ledger, line, 0, {"share": round(100 * float(share[line]), 1)})

        yield from several(np.flatnonzero(off & (under >= FEW)), fault)


MISSTATED = (
    "Look whether ages were rounded or overstated in one of the two counts; close the table "
)
CHECKS: tuple[Check[Ledger], ...] = (
    Check(
        key="infant_share",
        severity="warning",
        meaning="Of the children who died under five, those under one are fewer than half or more "
        "than 96 in 100, all years together and beyond chance.",
        why="Deaths in the first days are the ones most often not registered; and “1” is "
        "sometimes written for the first year of life.",
        found="{share} % under age 1 in {area}, {sex} {year}",
        expected="50 to 96 %",
        remedy="Compare infant deaths with the births and with their source.",
        source="United Nations (1955), Manual II: Methods of Appraisal of Quality of Basic Data, "
        "ch. 3; the limits are Ebbline's own.",
        find=_infant_share,
    ),
    Check(
        key="old_age_rates_fall",
        severity="warning",
        meaning="Above age 60 the death rate falls from one age group to the next, with 100 "
        "deaths or more in both and beyond chance, all years together.",
        why="Death rates rise with age to the highest ages that can be observed. A fall is most "
        "often a population too large: ages overstated, or the open group split wrongly.",
        found="a death rate of {rate} per 1,000 in {area}, {sex} {year}, age {age}",
        expected="more than the {other} at age {before}",
        remedy=MISSTATED + "below that age where it cannot be put right.",
        source="Coale & Kisker (1990), Asian and Pacific Population Forum 4(1), 1-31; the limits "
        "are Ebbline's own.",
        find=_falls,
    ),
    Check(
        key="spike_at_round_age",
        severity="warning",
        meaning="At an age that ends in 0 or 5 the death rate stands out by more than 5 % between "
        "the ages before and after it, with 100 deaths or more at each, all years together.",
        why="Whoever does not know an age says a round one. Deaths and population do not do it "
        "alike, and the rate at round ages gives it away.",
        found="a death rate of {rate} per 1,000 in {area}, {sex} {year}, age {age}",
        expected="about {other}, between its neighbours",
        remedy="Use five-year groups, in which most of it cancels; say in the note what is known.",
        source="Preston, Elo & Stewart (1999), Population Studies 53, 165-177; the limits are "
        "Ebbline's own.",
        find=_spikes,
    ),
    Check(
        key="sexes_cross",
        severity="warning",
        meaning="Men die at higher rates than women at 60 to 79 and at lower ones from 85 on, "
        "beyond chance, all years together.",
        why="Lines of death rates that cross at old ages are real now and then; more often one of "
        "the two has its ages overstated.",
        found="men at {young} times the rates of women at 60 to 79, {old} times from 85 on, in "
        "{area}, {year}",
        expected="no crossing",
        remedy=MISSTATED + "at 85 where ages are in doubt.",
        source="Coale & Kisker (1986), Population Studies 40, 389-401.",
        find=_sexes_cross,
    ),
    Check(
        key="areas_cross",
        severity="warning",
        meaning="An area has higher death rates than the others at 60 to 79 and lower ones from "
        "85 on, beyond chance, all years together.",
        why="High mortality that turns low at the oldest ages is the known sign of overstated "
        "ages.",
        found="{young} times the rates of the other areas at 60 to 79, {old} times from 85 on, in "
        "{area}, {sex} {year}",
        expected="no crossing",
        remedy=MISSTATED + "at 85 where ages are in doubt.",
        source="Coale & Kisker (1986), Population Studies 40, 389-401.",
        find=_areas_cross,
    ),
)
