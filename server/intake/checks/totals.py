"""Checks of totals that the file delivers against the sums of their parts."""

from collections.abc import Iterator

import numpy as np

from server.intake.cells import sexes_of
from server.intake.checks.check import Check
from server.intake.ledger import AgeTotal, Ledger, Line, common_grid, summed
from server.intake.problems import Fault, Value
from server.intake.schedules import MEASURES


def _slack(measure: str, parts: int) -> float:
    """How far a total may be off: persons counted are whole, person-years may be rounded."""
    return 0.5 * (parts + 1) if measure == "person_years" else 0.5


def _differs(ledger: Ledger, place: int, measure: str, parts: list[Line]) -> Iterator[Fault]:
    """The age at which a delivered total is furthest from the sum of its parts, if it is off."""
    block, line = ledger.lines[measure][place]
    grid = common_grid([(block, line), *parts])
    total = block.grid.regroup(block.values[line], grid)
    parts_sum = summed(parts, grid)
    off = np.abs(total - parts_sum)
    if off.max() > _slack(measure, len(parts)):
        age = int(off.argmax())
        row = block.row[line, block.grid.position(grid.starts[age])]
        values: dict[str, Value] = {
            "age": grid.labels[age],
            "total": float(total[age]),
            "sum": float(parts_sum[age]),
        }
        yield block.fault(row, ledger.named(place) | values)


def _persons(ledger: Ledger) -> Iterator[Fault]:
    for measure in MEASURES.values():
        for place in ledger.both_sexes(measure).tolist():
            sexes = [ledger.lines[measure][sex] for sex in sexes_of(place)]
            yield from _differs(ledger, place, measure, sexes)


def _whole(ledger: Ledger) -> Iterator[Fault]:
    if ledger.elsewhere:
        return
    for measure in MEASURES.values():
        for place in ledger.wholes(measure):
            parts, missing = ledger.parts(place, measure)
            if parts and not missing:
                yield from _differs(ledger, place, measure, parts)


def _parts_missing(ledger: Ledger) -> Iterator[Fault]:
    """Wholes to be summed some of whose parts are not in the upload."""
    if ledger.whole in ledger.delivered or ledger.unplaced or len(ledger.spoiled):
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
        found = ledger.lines.get(total.measure, {}).get(total.place)
        if found is None or found[0].file != total.file:
            continue
        block, line = found
        ages = float(block.values[line].sum())
        if abs(ages - total.value) > _slack(total.measure, len(block.grid)):
            values = {**ledger.named(total.place), "total": total.value, "sum": ages}
            yield _fault(total, values)


def _only_all_ages(ledger: Ledger) -> Iterator[Fault]:
    for total in ledger.age_totals:
        if total.place in ledger.spoiled or total.place in ledger.lines.get(total.measure, {}):
            continue
        yield _fault(total, ledger.named(total.place))


def _fault(total: AgeTotal, values: dict[str, Value]) -> Fault:
    return Fault(column=total.column, file=total.file, row=total.row, values=values)


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
