"""Checks of a table of breaks against the areas and years there are."""

from collections.abc import Iterator
from dataclasses import dataclass

from server.intake.break_rows import NONE, ended
from server.intake.checks.check import Check
from server.intake.lists import SmallTable
from server.intake.problems import Fault, Problem, Value
from server.store.records import Break


@dataclass(frozen=True, slots=True)
class Said:
    """The rows that can be read, beside what there will be."""

    table: SmallTable
    rows: tuple[tuple[int, Break], ...]  # number of the row in the file, and what it says
    areas: frozenset[str]  # codes, handed in or standing
    periods: tuple[str, ...]  # handed in or standing, in order
    standing: tuple[Break, ...]

    def fault(self, row: int, field: str, **values: Value) -> Fault:
        column = self.table.column(field)
        return Fault(column=column, file=self.table.name, row=row, values=values)


def _unknown_area(said: Said) -> Iterator[Fault]:
    for row, one in said.rows:
        if one.area and one.area not in said.areas:
            known = ", ".join(sorted(said.areas))[:200]
            yield said.fault(row, "area", code=one.area, known=known)


def _outside(said: Said) -> Iterator[Fault]:
    if not said.periods:
        return
    first, last = said.periods[0], said.periods[-1]
    for row, one in said.rows:
        earliest = first if one.kind == "shock" else str(int(first) + 1)
        if one.kind != NONE and not earliest <= one.period <= last:
            yield said.fault(row, "year", year=one.period, first=first, last=last)


def _twice(said: Said) -> Iterator[Fault]:
    seen: dict[tuple[str, str, str, str], int] = {}
    for row, one in said.rows:
        key = (one.area, one.period, one.kind, one.cause)
        if key in seen:
            yield said.fault(row, "kind", kind=one.kind, year=one.period, other=seen[key])
        seen.setdefault(key, row)


def _ends_nothing(said: Said) -> Iterator[Fault]:
    for row, one in said.rows:
        if one.kind == NONE and not ended([one], said.standing):
            known = "; ".join(
                f"{old.period} {old.kind}{' ' if old.area else ''}{old.area}"
                for old in said.standing
            )
            yield said.fault(row, "kind", year=one.period, known=known[:200] or "none")


def _ratios(said: Said) -> Iterator[Fault]:
    for row, one in said.rows:
        if one.ratio is None and one.ratio_error is None:
            continue
        if one.kind != "coding":
            yield said.fault(row, "ratio", kind=one.kind)


def _without_error(said: Said) -> Iterator[Fault]:
    for row, one in said.rows:
        if (one.ratio is None) != (one.ratio_error is None) and one.kind == "coding":
            yield said.fault(row, "ratio_error" if one.ratio_error is None else "ratio")


CHECKS: tuple[Check[Said], ...] = (
    Check(
        key="break_of_unknown_area",
        severity="error",
        meaning="A break is stated for an area that there is not.",
        found="the code {code}",
        expected="one of {known}, or nothing for every area",
        remedy="Correct the code.",
        find=_unknown_area,
    ),
    Check(
        key="break_outside_years",
        severity="warning",
        meaning="A break is stated for a year that no counts lie on both sides of, so that nothing "
        "is parted by it.",
        found="{year}",
        expected="a year after {first} and not after {last}; a year of shock may be the first",
        remedy="Correct the year; it is the first year of the new kind.",
        find=_outside,
    ),
    Check(
        key="break_twice",
        severity="error",
        meaning="Two rows state the same break.",
        found="{kind} in {year} again",
        expected="one row for each break; this one stands in row {other}",
        remedy="Take one of the two rows out.",
        find=_twice,
    ),
    Check(
        key="break_ends_nothing",
        severity="error",
        meaning="A row is to end a break that there is not.",
        found="no break of this area, year and cause",
        expected="one of those that stand: {known}",
        remedy="Correct the area, the year or the cause, or take the row out.",
        find=_ends_nothing,
    ),
    Check(
        key="ratio_of_other_break",
        severity="error",
        meaning="A comparability ratio belongs to a break of coding.",
        found="a ratio for a break of the kind {kind}",
        expected="the kind coding",
        remedy="Correct the kind, or leave the ratio empty.",
        find=_ratios,
    ),
    Check(
        key="ratio_without_error",
        severity="error",
        meaning="A comparability ratio comes without its standard error, or the error without a "
        "ratio.",
        found="one of the two",
        expected="the ratio and its standard error",
        remedy="Add the number that is missing; the study of the ratio states it.",
        find=_without_error,
    ),
)


def problems_of(said: Said) -> list[Problem]:
    return [problem for check in CHECKS for problem in check.problems(said, said.table.name)]
