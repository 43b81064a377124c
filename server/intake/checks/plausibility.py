"""Checks of counts against the years around them, against births and against one another."""

from collections.abc import Iterator

import numpy as np

from engine.ages import Array
from server.intake.cells import YEARS, Flags, sexes_of
from server.intake.checks.check import Check
from server.intake.ledger import Ledger, Line
from server.intake.problems import Fault, figure
from server.intake.schedules import MEASURES


def _infants(ledger: Ledger) -> Iterator[Fault]:
    if not ledger.of("births"):
        return
    deaths = ledger.lines.get("deaths", {})
    for place, (block, line) in ledger.lines["births"].items():
        sexes = [place] if place in deaths else sexes_of(place)
        lines = [deaths[at] for at in sexes if at in deaths]
        if len(lines) != len(sexes) or not all(map(_first_year, lines)):
            continue
        infants = sum(float(other.values[at, 0]) for other, at in lines)
        if infants > block.values[line, 0]:
            other, at = lines[0]
            births = float(block.values[line, 0])
            values = {**ledger.named(place), "deaths": infants, "births": births}
            yield other.fault(other.row[at, 0], values)


def _neonates(ledger: Ledger) -> Iterator[Fault]:
    if not ledger.of("neonatal_deaths"):
        return
    deaths = ledger.lines.get("deaths", {})
    for place, (block, line) in ledger.lines.get("neonatal_deaths", {}).items():
        if place in deaths and _first_year(deaths[place]):
            other, at = deaths[place]
            infants, early = float(other.values[at, 0]), float(block.values[line, 0])
            if early > infants:
                values = {**ledger.named(place), "early": early, "deaths": infants}
                yield block.fault(block.row[line, 0], values)


def _first_year(line: Line) -> bool:
    return line[0].grid.has(1)


def _fractions(ledger: Ledger) -> Iterator[Fault]:
    for block in ledger.of("deaths"):
        broken = (block.stated != np.round(block.stated)) & (not block.estimated)
        if broken.any():
            yield block.fault(block.row[broken], {"text": figure(block.stated[broken][0])})


def _changing_ages(ledger: Ledger) -> Iterator[Fault]:
    """Areas and sexes whose deaths come in other age groups in some years."""
    blocks = ledger.of("deaths")
    if len(blocks) < 2:
        return
    series = np.concatenate([block.place // YEARS for block in blocks])
    grids = np.concatenate([np.full(len(b.place), n) for n, b in enumerate(blocks)])
    first: dict[int, int] = {}
    for place, grid in sorted(set(zip(series.tolist(), grids.tolist(), strict=True))):
        if first.setdefault(place, grid) != grid and blocks[first[place]].grid != blocks[grid].grid:
            block = blocks[grid]
            line = int(np.flatnonzero(block.place // YEARS == place)[0])
            place_values = ledger.named(int(block.place[line]))
            missing = set(blocks[first[place]].grid.starts) ^ set(block.grid.starts)
            ages = ", ".join(str(age) for age in sorted(missing)[:12])
            yield block.fault(block.row[line, 0], place_values | {"ages": ages})


def _more_deaths(ledger: Ledger) -> Iterator[Fault]:
    for pair in ledger.pairs:
        deaths, people = pair.deaths.values.sum(axis=-1), pair.people.values.sum(axis=-1)
        for line in np.flatnonzero((deaths > people) & (people > 0)).tolist():
            values = {"deaths": float(deaths[line]), "people": float(people[line])}
            place = ledger.named(int(pair.deaths.place[line]))
            yield pair.deaths.fault(pair.deaths.row[line], place | values)


def _points(ledger: Ledger) -> Iterator[Fault]:
    """Measures none of whose numbers has four digits before the point or after it, and some three
    after it: 12.345 and 987, as where the point stands between thousands."""
    for measure in MEASURES.values():
        blocks = ledger.of(measure)
        if any(
            block.values.max() >= 1000 or not _whole(block.values * 1000).all() for block in blocks
        ):
            continue
        for block in blocks:
            pointed = ~_whole(block.values * 100)
            if pointed.any():
                values = {"text": f"{block.values[pointed][0]:.3f}"}
                yield block.fault(block.row[pointed], values)


def _whole(values: Array) -> Flags:
    return np.asarray(np.abs(values - np.round(values)) < 1e-6)


CHECKS: tuple[Check[Ledger], ...] = (
    Check(
        key="infant_deaths_exceed_births",
        severity="warning",
        meaning="More children died in their first year than were born.",
        found="{deaths} deaths under age 1 in {area}, {sex} {year}",
        expected="at most {births}, the births of the year",
        remedy="Compare the births with their source.",
        find=_infants,
    ),
    Check(
        key="neonatal_deaths_exceed_infant_deaths",
        severity="warning",
        meaning="More children died before 28 days than in their whole first year, of which those "
        "days are a part.",
        found="{early} deaths before 28 days in {area}, {sex} {year}",
        expected="at most {deaths}, the deaths under age 1",
        remedy="Compare both with their source: the deaths under age 1 hold those before 28 days.",
        find=_neonates,
    ),
    Check(
        key="fractional_deaths",
        severity="warning",
        meaning="Deaths are not whole numbers. They are taken as they are.",
        found="{text}",
        expected="whole numbers of deaths",
        remedy="Say in the note where the fractions come from (deaths shared out, estimates).",
        find=_fractions,
    ),
    Check(
        key="age_groups_change",
        severity="warning",
        meaning="The deaths of one area and sex come in other age groups in some years. Each year "
        "is kept as it is.",
        found="other age groups from {year} in {area}, {sex}; they differ at age {ages}",
        expected="the same age groups in every year",
        remedy="Look whether an age is missing; comparisons are made on the common groups.",
        find=_changing_ages,
    ),
    Check(
        key="deaths_exceed_population",
        severity="warning",
        meaning="More people died in a year than lived in it.",
        found="{deaths} deaths in {area}, {sex} {year}",
        expected="fewer than {people}, the population",
        remedy="Look whether the two columns are taken for one another, or a number was cut short.",
        find=_more_deaths,
    ),
    Check(
        key="points_between_thousands",
        severity="warning",
        meaning="No number of a column is 1000 or more and some have three decimals, as where "
        "a point stands between thousands. The point is taken for a decimal point.",
        found="{text}, and no number of 1000 or more",
        expected="a point before decimals only",
        remedy="If the point stands between thousands, take it out; if decimals are meant, say so "
        "in the note.",
        find=_points,
    ),
)
