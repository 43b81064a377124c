"""Checks of sums over causes: all causes, groups and ranges of codes beside their parts."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from server.intake.causes.items import ALL
from server.intake.causes.parting import ByCause
from server.intake.cells import TOTAL, Flags, Ints
from server.intake.checks.check import Check, several
from server.intake.labels import NOT_STATED
from server.intake.ledger import Ledger
from server.intake.problems import Fault, Problem, Value

SLACK = 0.5  # deaths by which a sum may be off: rounded fractions


@dataclass(frozen=True, slots=True)
class CauseSums:
    """Deaths of one file by cause, among all that is handed in."""

    by_cause: ByCause
    ledger: Ledger

    def named(self, cell: int) -> dict[str, Value]:
        cells = self.by_cause.cells
        age = cells.sheet.labels.get("age")
        text = age.at(np.array([cell]))[0] if age else ""
        return {**self.ledger.named(int(cells.place[cell])), "age": text or NOT_STATED}

    def cause(self, item: int) -> str:
        """An item as the file calls it."""
        items, texts = self.by_cause.items, self.by_cause.texts
        if 0 < item <= items.entries:
            return items.list.causes[item - 1].label
        return next(text for text, at in zip(texts, items.of_text, strict=False) if at == item)

    @property
    def counts(self) -> Flags:
        """Cells whose deaths are in no other, [cell]."""
        cells = self.by_cause.cells
        return np.asarray(self.by_cause.at_ages & ~self.ledger.is_total(cells.place, "deaths"))

    @property
    def parted(self) -> Flags:
        """Cells of areas, sexes and years that have deaths by cause and age, [cell]."""
        by_cause = self.by_cause
        place, counts = by_cause.cells.place, by_cause.cell[by_cause.deaths > 0]
        return np.isin(place, place[counts[by_cause.at_ages[counts]]])


def _off(sums: CauseSums, differing: Flags, kept: Flags) -> Iterator[Fault]:
    found = sums.by_cause.sums
    worst = np.argsort(-np.abs(found.given - found.parts), kind="stable")
    at = worst[(differing & kept)[worst]]

    def fault(one: int) -> Fault:
        values = {"total": float(found.given[one]), "sum": float(found.parts[one])}
        cause = sums.cause(int(found.item[one]))
        return Fault(
            column=sums.by_cause.deaths_column,
            file=sums.by_cause.file,
            row=int(found.row[one]),
            values={**sums.named(int(found.cell[one])), "cause": cause, **values},
        )

    return several(at, fault)


def _is_all(sums: CauseSums) -> Flags:
    return np.asarray(sums.by_cause.sums.item == ALL)


def _more(sums: CauseSums) -> Flags:
    found = sums.by_cause.sums
    return np.asarray(found.parts - found.given > SLACK)


def _fewer(sums: CauseSums) -> Flags:
    found = sums.by_cause.sums
    return np.asarray(found.given - found.parts > SLACK)


def _exceed(sums: CauseSums) -> Iterator[Fault]:
    yield from _off(sums, _more(sums), _is_all(sums))


def _fall_short(sums: CauseSums) -> Iterator[Fault]:
    """A fault for all that is lacking: a share without cause is usual."""
    found = sums.by_cause.sums
    lacking = _fewer(sums) & _is_all(sums) & sums.parted[found.cell]
    lacking &= sums.counts[found.cell]
    if lacking.any():
        rows = found.row[lacking]
        without = float((found.given - found.parts)[lacking].sum())
        total = float(sums.by_cause.all_causes[sums.parted & sums.counts].sum())
        yield Fault(
            column=sums.by_cause.deaths_column,
            file=sums.by_cause.file,
            row=int(rows.min()),
            last_row=int(rows.max()),
            rows=len(rows),
            values={"without": without, "share": round(100 * without / total, 1)},
        )


def _group_exceeds(sums: CauseSums) -> Iterator[Fault]:
    yield from _off(sums, _more(sums), ~_is_all(sums))


def _group_falls_short(sums: CauseSums) -> Iterator[Fault]:
    yield from _off(sums, _fewer(sums), ~_is_all(sums))


def _longer(sums: CauseSums, codes: Ints) -> Iterator[Fault]:
    by_cause = sums.by_cause
    for item in codes.tolist():
        yield Fault(
            column=by_cause.column, file=by_cause.file, values={"code": sums.cause(int(item))}
        )


def _without_ages(sums: CauseSums) -> Iterator[Fault]:
    """Areas, sexes and years whose deaths are by cause at all ages together alone."""
    by_cause = sums.by_cause
    cells, counts = by_cause.cells, by_cause.cell[by_cause.deaths > 0]
    at_ages = np.isin(cells.place, cells.place[counts[cells.start[counts] != TOTAL]])
    bare = np.unique(counts[(cells.start[counts] == TOTAL) & ~at_ages[counts]])
    for cell in bare.tolist():
        row = int(by_cause.row[cell])
        yield Fault(column=by_cause.column, file=by_cause.file, row=row, values=sums.named(cell))


CHECKS: tuple[Check[CauseSums], ...] = (
    Check(
        key="causes_exceed_total",
        severity="error",
        meaning="The deaths of the causes are together more than those of all causes.",
        found="{total} deaths of all causes in {area}, {sex} {year}, age {age}",
        expected="at least {sum}, the causes together",
        remedy="Find out which is wrong. Groups beside the causes that make them up must be in the "
        "list as groups, or go out of the file.",
        find=_exceed,
    ),
    Check(
        key="deaths_without_cause",
        severity="warning",
        meaning="The deaths of the causes are together fewer than those of all causes. What is "
        "lacking is shown as “cause not stated”.",
        found="{without} deaths in no cause, {share} % of those by cause",
        expected="causes that add up to all deaths",
        remedy="Look whether a cause is missing in the file; else say in the note why the cause is "
        "not known.",
        find=_fall_short,
    ),
    Check(
        key="causes_exceed_group",
        severity="error",
        meaning="The causes of a group, or the codes of a cause, are together more than the group.",
        found="{total} deaths of “{cause}” in {area}, {sex} {year}, age {age}",
        expected="at least {sum}, its parts together",
        remedy="Find out which is wrong.",
        find=_group_exceeds,
    ),
    Check(
        key="group_differs",
        severity="warning",
        meaning="A group of causes, or a range of codes, has more deaths than its parts in the "
        "file. What is lacking in a group has no cause; a single cause keeps it.",
        found="{total} deaths of “{cause}” in {area}, {sex} {year}, age {age}",
        expected="{sum}, its parts together",
        remedy="Look whether a part of the group is missing in the file.",
        find=_group_falls_short,
    ),
    Check(
        key="code_is_sum",
        severity="warning",
        meaning="A code stands beside longer ones that begin with it, and has their sum wherever "
        "it stands. It is taken as their sum and not counted again.",
        found="{code} with the deaths of its longer codes together",
        expected="each death under one code",
        remedy="Nothing is to be done if it is their sum; else write the shorter code with a last "
        "digit of its own.",
        find=lambda sums: _longer(sums, sums.by_cause.summed),
    ),
    Check(
        key="code_beside_longer",
        severity="warning",
        meaning="A code stands beside longer ones that begin with it, and is not their sum. Its "
        "deaths are counted beside theirs.",
        found="{code} beside longer codes that begin with it",
        expected="each death under one code",
        remedy="Nothing is to be done if these are other deaths; else take the sums out of the "
        "file.",
        find=lambda sums: _longer(sums, sums.by_cause.apart),
    ),
    Check(
        key="causes_without_ages",
        severity="error",
        meaning="Deaths are by cause at all ages together, and not by age.",
        found="causes at all ages alone in {area}, {sex} {year}",
        expected="a row for each cause and age group",
        remedy="Add the age groups by cause, or take the rows by cause out.",
        find=_without_ages,
    ),
)


def problems_of(sums: CauseSums) -> list[Problem]:
    return [problem for check in CHECKS for problem in check.problems(sums)]
