"""Checks of death rates by age: the first years, and the ages at which errors of age show."""

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from engine.ageing import within
from engine.ages import Array
from engine.open_age import SPAN, YOUNGEST, implied_population, judged_age
from engine.panel import Panel
from engine.settings import find
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
IMPLIED, ALONE = (0.8, 1.25), (0.65, 1.25)
LEAST_GROUPS = 5  # between 50 and 84, from which the rise of death rates is read
SETTINGS = replace(find("almanac-2"), level=0.999)  # of the limits of the implied population


def _pooled(ledger: Ledger) -> Iterator[Rated]:
    for one in rated(ledger, parts=True):
        yield one.pooled()


def _falls(ledger: Ledger) -> Iterator[Fault]:
    for one in _pooled(ledger):
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
    for one in _pooled(ledger):
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
    for one in _pooled(ledger):
        women, men = one.couples()
        yield from _crossings(ledger, one, men, _crossed(one, men, women))


def _areas_cross(ledger: Ledger) -> Iterator[Fault]:
    """Each area against all others of its sex."""
    for one in _pooled(ledger):
        for sex in "fmp":
            lines = one.of(sex)
            if len(lines) < 2:
                continue
            rest = _others(one, lines)
            both = np.arange(len(lines))
            found = _crossed(rest, both, both + len(lines))
            yield from _crossings(ledger, one, lines, found)


def _others(one: Rated, lines: Ints) -> Rated:
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
    for one in _pooled(ledger):
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


def _open_age(ledger: Ledger) -> Iterator[Fault]:
    """People at the open age that the deaths there imply, against the other areas' of the sex; one
    area alone against what a law that rises evenly gives."""
    for one in _pooled(ledger):
        if len(one.starts[within(one.grid, SPAN)]) < LEAST_GROUPS:
            continue
        if judged_age(one.grid) < YOUNGEST:
            continue
        old = one.starts >= judged_age(one.grid)
        enough = one.deaths[:, old].sum(axis=-1) >= FEW
        for sex in "fmp":
            lines = one.of(sex)
            if enough[lines].any():
                times, off = _implied(one, lines, sex)
                yield from _open_ages(ledger, one, lines, times, off & enough[lines])


def _open_ages(
    ledger: Ledger, one: Rated, lines: Ints, times: Array, off: Flags
) -> Iterator[Fault]:
    age, (low, high) = judged_age(one.grid), IMPLIED if len(lines) > 1 else ALONE

    def fault(at: int) -> Fault:
        values: dict[str, Value] = {
            "age": f"{age}+",
            "times": round(float(times[at]), 2),
            "low": low,
            "high": high,
        }
        return one.fault(ledger, int(lines[at]), one.grid.position(age), values)

    yield from several(np.flatnonzero(off), fault)


def _implied(one: Rated, lines: Ints, sex: str) -> tuple[Array, Flags]:
    """The population implied over the one handed in, and where it is off beyond chance."""
    rest, many = _others(one, lines), len(lines)
    own = Panel.of(one.grid, rest.deaths[:many], rest.people[:many], sex=sex)
    if many == 1:
        alone = implied_population(own, own, SETTINGS).observed
        return alone, np.asarray((alone < ALONE[0]) | (alone > ALONE[1]))
    whole = Panel.of(one.grid, rest.deaths[many:], rest.people[many:], sex=sex)
    nobody = own.over(lambda counts: counts * 0.0)
    ratio = implied_population(own, whole, SETTINGS, shared=nobody).ratio
    with np.errstate(invalid="ignore"):
        off = (ratio.high < IMPLIED[0]) | (ratio.low > IMPLIED[1])
    return ratio.value, np.asarray(off)


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
    Check(
        key="open_age_population",
        severity="warning",
        meaning="The deaths at the open age imply a population there that is more than a fifth "
        "off the one handed in, set against the other areas; for an area alone, that its death "
        "rate is less than 65 or more than 125 % of what the rise from 50 to 84 leads to.",
        why="Few people make up the open age, and an estimate carried forward from an old census "
        "soon has too many or too few of them.",
        found="a population implied that is {times} times the one at {age} in {area}, {sex} {year}",
        expected="{low} to {high} times",
        remedy="Ask how the population at the highest ages was estimated; a lower open age is "
        "safer.",
        source="Preston, Elo & Stewart (1999), Population Studies 53, 165-177; the ratio of two "
        "populations is Ebbline's own.",
        find=_open_age,
    ),
)
