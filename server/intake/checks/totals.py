"""Checks of totals that the file delivers against the sums of their parts."""

from collections.abc import Iterator

import numpy as np

from server.intake.cells import YEARS, parts_of, place_of, sexes_of
from server.intake.checks.check import Check
from server.intake.labels import NOT_STATED
from server.intake.ledger import Ledger, common_grid, summed
from server.intake.problems import Fault, Text, Value
from server.intake.schedules import MEASURES, Aside


def _slack(measure: str, parts: int) -> float:
    """How far a total may be off: persons counted are whole, person-years may be rounded."""
    return 0.5 * (parts + 1) if measure == "person_years" else 0.5


def _differs(
    ledger: Ledger, place: int, measure: str, parts: list[int], unknown: int
) -> Iterator[Fault]:
    """The age at which a delivered total is furthest from the sum of its parts, if it is off. What
    does not state its sex, age or area (at the place `unknown`) is a part too."""
    lines, ageless = ledger.lines[measure], ledger.of_no_age.get(measure, {})
    beside = ledger.by_age.get(measure, {}).get(unknown, [])
    bare = 0.0 if beside else ledger.at_all_ages.get(measure, {}).get(unknown, 0.0)
    block, line = lines[place]
    ages = [lines[part] for part in parts]
    grid = common_grid([(block, line), *ages])
    total, together = block.grid.regroup(block.values[line], grid), summed(ages, grid)
    labels = grid.labels
    without = sum(ageless.get(part, 0.0) for part in (*parts, unknown))
    groups = [(*np.searchsorted(grid.starts, span, side="right"), n) for span, n in beside]
    if bare or any(first != last for first, last, _ in groups):  # of no one group
        given, count = ageless.get(place, 0.0), sum(n for _, n in beside)
        total = np.array([total.sum() + given])
        together = np.array([together.sum() + without + count + bare])
        labels = (Text("all ages"),)
    else:
        together = together.copy()
        for first, _, count in groups:
            together[first - 1] += count
        if place in ageless:
            total, together = np.append(total, ageless[place]), np.append(together, without)
            labels = (*labels, NOT_STATED)
    off = np.abs(total - together)
    if off.max() > _slack(measure, len(parts) + bool(beside)):
        age = int(off.argmax())
        row = block.row[line, block.grid.position(grid.starts[age]) if age < len(grid) else 0]
        values: dict[str, Value] = {
            "age": labels[age],
            "total": float(total[age]),
            "sum": float(together[age]),
        }
        yield block.fault(row, ledger.named(place) | values)


def _persons(ledger: Ledger) -> Iterator[Fault]:
    for measure in MEASURES.values():
        for place in ledger.both_sexes(measure).tolist():
            yield from _differs(ledger, place, measure, [*sexes_of(place)], place + YEARS)


def _whole(ledger: Ledger) -> Iterator[Fault]:
    if ledger.elsewhere:
        return
    for measure in MEASURES.values():
        for place in ledger.wholes(measure):
            parts, missing = ledger.parts(place, measure)
            if parts and not missing:
                _, sex, year = parts_of(place)
                unknown = place_of(len(ledger.codes), sex, year)
                yield from _differs(ledger, place, measure, parts, unknown)


def _parts_missing(ledger: Ledger) -> Iterator[Fault]:
    """Wholes to be summed some of whose parts are not in the upload."""
    if ledger.whole in ledger.delivered or ledger.unplaced or ledger.faulty:
        return
    for measure in MEASURES.values():
        for place in ledger.wholes(measure):
            missing = ledger.parts(place, measure)[1]
            if missing:
                block, line = ledger.lines[measure][place]
                values = {**ledger.named(place), "missing": ", ".join(missing)[:200]}
                yield block.fault(block.row[line, 0], values)


def _all_ages(ledger: Ledger) -> Iterator[Fault]:
    for total in ledger.age_totals:
        for line, place in enumerate(total.place.tolist()):
            ages = _at_ages(ledger, total, place)
            if ages is None:
                continue
            together = ages[0] + ledger.of_no_age.get(total.measure, {}).get(place, 0.0)
            given = float(total.values[line])
            if abs(together - given) > _slack(total.measure, ages[1]):
                values = {**ledger.named(place), "total": given, "sum": together}
                yield total.fault(total.row[line], values)


def _at_ages(ledger: Ledger, total: Aside, place: int) -> tuple[float, int] | None:
    """Sum and number of the age groups of a place, in the file of a total; None: there are none."""
    if found := ledger.lines.get(total.measure, {}).get(place):
        block, at = found
        same = block.file == total.file
        return (float(block.values[at].sum()), len(block.grid)) if same else None
    groups = ledger.by_age.get(total.measure, {}).get(place)
    return (sum(count for _, count in groups), len(groups)) if groups else None


def _only_all_ages(ledger: Ledger) -> Iterator[Fault]:
    for total in ledger.age_totals:
        known = np.concatenate([ledger.spoiled, ledger.places(total.measure)])
        bare = ledger.states(total.place) & ~np.isin(total.place, known)
        for line in np.flatnonzero(bare).tolist():
            yield total.fault(total.row[line], ledger.named(int(total.place[line])))


CHECKS: tuple[Check[Ledger], ...] = (
    Check(
        key="persons_differ",
        severity="warning",
        meaning="Persons as delivered are not women and men together. They are left out, and the "
        "sum is used.",
        found="{total} persons in {area}, {year}, age {age}",
        expected="{sum}, women and men together",
        remedy="Find out which of the three is wrong. The sum will be used.",
        find=_persons,
    ),
    Check(
        key="whole_differs",
        severity="warning",
        meaning="The whole area as delivered is not the sum of its parts.",
        found="{total} in {area}, {sex} {year}, age {age}",
        expected="{sum}, all parts together",
        remedy="Find out which is wrong. A whole that is declared as delivered is kept; otherwise "
        "the sum is used.",
        find=_whole,
    ),
    Check(
        key="parts_missing",
        severity="warning",
        meaning="The whole area is to be summed from its parts, but parts are missing in the "
        "upload.",
        found="{area} without {missing}, {sex} {year}",
        expected="all parts of {area}",
        remedy="Hand in the missing parts, unless the edition before has them; or declare {area} "
        "as delivered.",
        find=_parts_missing,
    ),
    Check(
        key="all_ages_differ",
        severity="warning",
        meaning="A total over the ages is not the sum of the ages. It only serves as a check.",
        found="{total} at all ages in {area}, {sex} {year}",
        expected="{sum}, all age groups together",
        remedy="Find out which is wrong; the total is often right and one age is missing some.",
        find=_all_ages,
    ),
    Check(
        key="only_all_ages",
        severity="error",
        meaning="There is a total over the ages, and no age groups that make it up.",
        found="only all ages together in {area}, {sex} {year}",
        expected="a row for each age group",
        remedy="Add the age groups, or take the row out.",
        find=_only_all_ages,
    ),
)
