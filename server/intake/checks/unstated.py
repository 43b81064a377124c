"""Checks of counts that do not state their sex, age or area."""

from collections import defaultdict
from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np

from server.intake.cells import YEARS, Ints, parts_of
from server.intake.checks.check import Check
from server.intake.dealing import UNIT, in_units
from server.intake.ledger import Ledger
from server.intake.problems import Fault, Value
from server.intake.sharing import Part, Settled


def _undecided(matter: str) -> Callable[[Settled], Iterator[Fault]]:
    """Counts of which nobody said what is to be done, a fault for each measure."""

    def find(settled: Settled) -> Iterator[Fault]:
        by_measure: dict[str, list[Part]] = defaultdict(list)
        for part in settled.parts:
            if matter in part.lacks and matter not in part.source.rule.chosen:
                by_measure[part.source.measure].append(part)
        for parts in by_measure.values():
            count = sum(int(part.units.sum()) for part in parts) / UNIT
            rows = np.concatenate([part.source.row for part in parts])
            yield parts[0].source.fault(rows, {"count": count})

    return find


@dataclass(frozen=True, slots=True)
class _Shares:
    """What is not stated in an area and year, beside what is, millionths: [area and year]."""

    parts: list[Part]
    at: Ints  # area and year in one number
    lacking: Ints
    together: Ints


def _shares(settled: Settled, *, spread: bool) -> Iterator[_Shares]:
    """Of each measure some of which is shared out, or left out; totals of others do not count."""
    ledger = settled.delivered
    by_measure: dict[str, list[Part]] = defaultdict(list)
    for part in settled.parts:
        if part.spread == spread and (spread or "left_out" in _choices(part)):
            by_measure[part.source.measure].append(part)
    for measure, parts in by_measure.items():
        lacking = np.concatenate([_own(ledger, part) for part in parts])
        at, which = np.unique(lacking[:, 0], return_inverse=True)
        sums = np.zeros((2, len(at)), np.int64)
        np.add.at(sums[0], which, lacking[:, 1])
        sums[1] = sums[0] + _stated(ledger, measure, at)
        yield _Shares(parts, at, *sums)


def _choices(part: Part) -> set[str]:
    """What was chosen for what the part lacks."""
    return {part.source.rule.chosen.get(matter, "") for matter in part.lacks}


def _own(ledger: Ledger, part: Part) -> Ints:
    """Area and year of each line in one number, and its count: [line, 2]."""
    area, _, year = parts_of(part.place)
    units = np.where(ledger.is_total(part.place, part.source.measure), 0, part.units)
    return np.stack([area * YEARS + year, units], axis=-1)


def _stated(ledger: Ledger, measure: str, at: Ints) -> Ints:
    """Counts of these areas and years that state all; of the area that is not stated, those of all
    areas."""
    found = np.zeros(len(at), np.int64)
    nowhere = len(ledger.codes)
    for block in ledger.of(measure):
        own = block.pick(~ledger.is_total(block.place, measure))
        area, _, year = parts_of(own.place)
        units = in_units(own.values).sum(axis=-1)
        for key in (area * YEARS + year, nowhere * YEARS + year):
            place = np.minimum(np.searchsorted(at, key), len(at) - 1)
            np.add.at(found, place, np.where(at[place] == key, units, 0))
    return found


def _too_many(settled: Settled, *, spread: bool) -> Iterator[Fault]:
    if settled.delivered.unplaced or settled.delivered.faulty:
        return  # what is stated is not all known
    for shares in _shares(settled, spread=spread):
        most = shares.parts[0].source.rule.most
        over = shares.lacking * 100 > most * shares.together
        if spread:  # of what has nothing to go by, another check tells
            over &= shares.together > shares.lacking
        for at in np.flatnonzero(over).tolist():
            lacking, together = int(shares.lacking[at]), int(shares.together[at])
            area, year = divmod(int(shares.at[at]), YEARS)
            values: dict[str, Value] = {
                "count": lacking / UNIT,
                "total": together / UNIT,
                "percent": round(100 * lacking / together, 1),
                "most": most,
                **settled.delivered.named_area(area),
                "year": str(year),
            }
            yield shares.parts[0].source.fault(_rows(shares.parts, area, year), values)


def _rows(parts: list[Part], area: int, year: int) -> Ints:
    """Rows of the file that parts have in an area and year."""
    found = [np.zeros(0, np.int64)]
    for part in parts:
        areas, _, years = parts_of(part.place)
        found.append(part.source.row[(areas == area) & (years == year)])
    return np.concatenate(found)


def _nothing_to_go_by(settled: Settled) -> Iterator[Fault]:
    if settled.delivered.unplaced or settled.delivered.faulty:
        return
    for part in settled.lost:
        for line, place in enumerate(part.place.tolist()):
            values = {
                **settled.delivered.named(place),
                "count": float(part.source.values[line]),
            }
            yield part.source.fault(part.source.row[line], values)


def _beside_unknown(settled: Settled) -> Iterator[Fault]:
    """Counts to be shared out in a year of which some stated counts are not available: the rest
    would get their share."""
    ledger = settled.delivered
    years = np.unique(parts_of(ledger.unknown)[2])
    for part in settled.parts:
        if part.spread:
            for year in np.intersect1d(parts_of(part.place)[2], years).tolist():
                rows = part.source.row[parts_of(part.place)[2] == year]
                yield part.source.fault(rows, {"year": str(year)})


def _twice(settled: Settled) -> Iterator[Fault]:
    ledger = settled.delivered
    for aside in ledger.ageless:
        again = np.flatnonzero(aside.place[1:] == aside.place[:-1]) + 1
        for line in again.tolist():
            yield aside.fault(aside.row[line - 1 : line + 1], ledger.named(int(aside.place[line])))


CHOOSE = (
    "Say in the mapping what is to be done: share them out in proportion to the counts that do "
    "state it, or leave them out."
)

CHECKS: tuple[Check[Settled], ...] = (
    Check(
        key="sex_not_stated",
        severity="error",
        meaning="Counts do not state their sex, and nobody has said what is to be done with them.",
        found="{count} of unknown sex",
        expected="a choice: share out or leave out",
        remedy=CHOOSE,
        find=_undecided("sex"),
    ),
    Check(
        key="age_not_stated",
        severity="error",
        meaning="Counts do not state their age, and nobody has said what is to be done with them.",
        found="{count} of unknown age",
        expected="a choice: share out or leave out",
        remedy=CHOOSE,
        find=_undecided("age"),
    ),
    Check(
        key="area_not_stated",
        severity="error",
        meaning="Counts do not state their area, and nobody has said what is to be done with them.",
        found="{count} of unknown area",
        expected="a choice: share out or leave out",
        remedy=CHOOSE,
        find=_undecided("area"),
    ),
    Check(
        key="too_many_not_stated",
        severity="error",
        meaning="So many counts of an area and year do not state all that sharing them out by the "
        "rest would be guessing.",
        found="{count} of {total} in {area}, {year}, which is {percent} %",
        expected="at most {most} % to be shared out",
        remedy="Find out what is missing, or leave these counts out. Where it is known that they "
        "are spread as the others are, the limit in the mapping may be raised.",
        find=lambda settled: _too_many(settled, spread=True),
    ),
    Check(
        key="many_left_out",
        severity="warning",
        meaning="Many counts of an area and year are left out, since they do not state all. Rates "
        "will be too low.",
        found="{count} of {total} in {area}, {year}, which is {percent} %",
        expected="at most {most} % to be left out",
        remedy="Find out what is missing, or say in the note why the counts may be left out.",
        find=lambda settled: _too_many(settled, spread=False),
    ),
    Check(
        key="nothing_to_share_by",
        severity="error",
        meaning="Counts are to be shared out, but no stated ones tell how.",
        found="{count} in {area}, {sex} {year}, and none there that state all",
        expected="stated counts of the same year to go by",
        remedy="Add the stated counts, or leave these out.",
        find=_nothing_to_go_by,
    ),
    Check(
        key="shared_beside_unknown",
        severity="error",
        meaning="Counts are to be shared out in a year of which some stated counts are not "
        "available or withheld, so that the others would get their share.",
        found="counts of {year} to be shared out, and others of that year that are not known",
        expected="all stated counts of the year",
        remedy="Leave these counts out, or hand in the stated ones.",
        find=_beside_unknown,
    ),
    Check(
        key="not_stated_twice",
        severity="error",
        meaning="Counts of unknown age stand twice for the same area, sex and year.",
        found="two rows of unknown age in {area}, {sex} {year}",
        expected="one row for each area, sex and year",
        remedy="Take one of the rows out; add up rows that were split by another column.",
        find=_twice,
    ),
)
