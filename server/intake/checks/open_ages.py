"""The check of the population at the open age against the deaths there."""

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from engine.ageing import within
from engine.ages import Array
from engine.open_age import SPAN, YOUNGEST, implied_population, judged_age
from engine.panel import Panel
from engine.settings import find
from server.intake.cells import Flags, Ints
from server.intake.checks.check import Check, several
from server.intake.checks.old_ages import others, pooled
from server.intake.checks.sexes import FEW
from server.intake.ledger import Ledger
from server.intake.problems import Fault, Value
from server.intake.rated import Rated

IMPLIED, ALONE = (0.8, 1.25), (0.65, 1.25)  # over the population handed in
SAME = 0.1
LEAST_GROUPS = 5  # between 50 and 84, from which the rise of death rates is read
SETTINGS = replace(find("almanac-2"), level=0.999)  # of the limits of the implied population


def _open_age(ledger: Ledger) -> Iterator[Fault]:
    """People at the open age that the deaths there imply, against the other areas' of the sex; one
    area alone against what a law that rises evenly gives."""
    for one in pooled(ledger):
        if len(one.starts[within(one.grid, SPAN)]) < LEAST_GROUPS:
            continue
        if judged_age(one.grid) < YOUNGEST:
            continue
        old = one.starts >= judged_age(one.grid)
        enough = one.deaths[:, old].sum(axis=-1) >= FEW
        for sex in "fmp":
            every = one.of(sex)
            at = np.flatnonzero(enough[every] & _apart(one, every, old))
            if len(at):
                yield from _told(ledger, one, every, at, sex)


def _apart(one: Rated, every: Ints, old: Flags) -> Flags:
    """Lines whose rate at the judged ages, over that of the ten years before them, is more than a
    tenth off the others'. No law is fitted to the rest: their ratio could not be off."""
    if len(every) < 2:
        return np.ones(len(every), np.bool_)
    before = (one.starts >= one.starts[old][0] - 10) & ~old
    rest = others(one, every)
    with np.errstate(all="ignore"):
        oldest, younger = (
            rest.deaths[:, ages].sum(axis=-1) / rest.people[:, ages].sum(axis=-1)
            for ages in (old, before)
        )
        rise = np.log(oldest / younger)
        near = np.abs(rise[: len(every)] - rise[len(every) :]) < SAME
    return np.asarray(~near, np.bool_)


def _told(ledger: Ledger, one: Rated, every: Ints, at: Ints, sex: str) -> Iterator[Fault]:
    times, off = _implied(one, every, at, sex)
    age, (low, high) = judged_age(one.grid), IMPLIED if len(every) > 1 else ALONE

    def fault(number: int) -> Fault:
        values: dict[str, Value] = {
            "age": f"{age}+",
            "times": round(float(times[number]), 2),
            "low": low,
            "high": high,
        }
        return one.fault(ledger, int(every[at[number]]), one.grid.position(age), values)

    yield from several(np.flatnonzero(off), fault)


def _implied(one: Rated, every: Ints, at: Ints, sex: str) -> tuple[Array, Flags]:
    """The population implied over the one handed in, of some lines against all others of the sex,
    and where it is off beyond chance."""
    rest = others(one, every)
    own = Panel.of(one.grid, rest.deaths[at], rest.people[at], sex=sex)
    if len(every) == 1:
        alone = implied_population(own, own, SETTINGS).observed
        return alone, np.asarray((alone < ALONE[0]) | (alone > ALONE[1]))
    beside = at + len(every)
    whole = Panel.of(one.grid, rest.deaths[beside], rest.people[beside], sex=sex)
    nobody = own.over(lambda counts: counts * 0.0)
    ratio = implied_population(own, whole, SETTINGS, shared=nobody).ratio
    with np.errstate(invalid="ignore"):
        off = (ratio.high < IMPLIED[0]) | (ratio.low > IMPLIED[1])
    return ratio.value, np.asarray(off)


CHECKS: tuple[Check[Ledger], ...] = (
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
