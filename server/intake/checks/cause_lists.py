"""Checks of a cause list of the user's own: a tree whose entries hold each code once."""

from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import pairwise

from server.intake.causes.codes import Range
from server.intake.causes.lists import CHAPTERS
from server.intake.causes.placing import LISTS, CauseList, own_list
from server.intake.checks.check import Check
from server.intake.lists import SmallTable
from server.intake.problems import Fault, Problem
from server.store.records import Cause


@dataclass(frozen=True)
class OwnList:
    """A table of causes, and each row of it that can be read."""

    table: SmallTable
    rows: tuple[tuple[int, Cause], ...]

    @property
    def list(self) -> CauseList:
        return own_list(tuple(cause for _, cause in self.rows))

    def fault(self, row: int, field: str, **values: str) -> Fault:
        column = self.table.column(field)
        return Fault(column=column, file=self.table.name, row=row, values=values)


def _doubled(own: OwnList) -> Iterator[Fault]:
    times = Counter(cause.code for _, cause in own.rows)
    for row, cause in own.rows:
        if times[cause.code] > 1:
            yield own.fault(row, "code", code=cause.code)


def _unknown_parent(own: OwnList) -> Iterator[Fault]:
    codes = {cause.code for _, cause in own.rows}
    for row, cause in own.rows:
        if cause.parent and cause.parent not in codes:
            yield own.fault(row, "parent", code=cause.code, parent=cause.parent)


def _circle(own: OwnList) -> Iterator[Fault]:
    above = {cause.code: cause.parent for _, cause in own.rows}
    for row, cause in own.rows:
        at, seen = cause.parent, set()
        while at in above and at not in seen and at != cause.code:
            seen.add(at)
            at = above[at]
        if at == cause.code:
            yield own.fault(row, "parent", code=cause.code)


def _unreadable(own: OwnList) -> Iterator[Fault]:
    notation = own.list.notation
    for row, cause in own.rows:
        for text in cause.ranges:
            if notation.ranges(text) is None:
                yield own.fault(row, "codes", text=text)


def _overlap(own: OwnList) -> Iterator[Fault]:
    """Ranges of two entries that hold the same codes and name as many digits."""
    found = own.list
    row_of = {at: row for at, (row, _) in enumerate(own.rows)}
    for fine in {one.fine for one, _ in found.ranges}:
        ordered = sorted((one, leaf) for one, leaf in found.ranges if one.fine == fine)
        reached: tuple[Range, int] | None = None
        for one, leaf in ordered:
            if reached and one.meets(reached[0]):
                other = found.causes[reached[1]].code
                yield own.fault(row_of[leaf], "codes", code=found.causes[leaf].code, other=other)
            if not reached or one.end > reached[0].end:
                reached = (one, leaf)


def _gaps(own: OwnList) -> Iterator[Fault]:
    """Codes that no entry holds, between those that some do; of ICD-10 all that are a cause."""
    found = own.list
    if not found.ranges:
        return
    held = _merged([one for one, _ in found.ranges if not one.fine])
    if found.is_icd_10:
        wanted = [
            one
            for one, leaf in LISTS["chapters"].ranges
            if CHAPTERS[leaf].kind != "not_underlying" and not one.fine
        ]
        lacking = [gap for one in _merged(wanted) for gap in _without(one, held)]
    else:
        lacking = [
            f"{_text(one.last.letters, one.last.number + 1)}–"
            f"{_text(other.first.letters, other.first.number - 1)}"
            for one, other in pairwise(held)
            if one.last.letters == other.first.letters
        ]
    if lacking:
        yield Fault(
            column=own.table.column("codes"),
            file=own.table.name,
            values={"count": len(lacking), "codes": ", ".join(lacking)[:200]},
        )


def _merged(ranges: list[Range]) -> list[Range]:
    """Ranges in order, those that follow on one another as one."""
    found: list[Range] = []
    for one in sorted(ranges):
        last = found[-1] if found else None
        if last and one.first <= _next(last):
            found[-1] = Range(last.first, max(last.last, one.last))
        else:
            found.append(one)
    return found


def _next(one: Range) -> tuple[str, int, str]:
    """Where a range that follows on another begins."""
    letters, number = one.last.letters, one.last.number
    if number == 99 and len(letters) == 1 and letters != "Z":
        return (chr(ord(letters) + 1), 0, "")
    return (letters, number + 1, "")


def _without(one: Range, held: list[Range]) -> Iterator[str]:
    """What of a range of ICD-10 no range of others holds."""
    at, last = one.first[:2], one.last[:2]
    for other in held:
        if other.last[:2] < at or other.first[:2] > last:
            continue
        if other.first[:2] > at:
            yield _span(at, _before(other.first[:2]))
        at = _next(other)[:2]
    if at <= last:
        yield _span(at, last)


def _before(head: tuple[str, int]) -> tuple[str, int]:
    letters, number = head
    return (letters, number - 1) if number else (chr(ord(letters) - 1), 99)


def _span(first: tuple[str, int], last: tuple[str, int]) -> str:
    one, other = (f"{letters}{number:02d}" for letters, number in (first, last))
    return one if one == other else f"{one}–{other}"


def _text(letters: str, number: int) -> str:
    return f"{letters}{number}"


CHECKS: tuple[Check[OwnList], ...] = (
    Check(
        key="cause_code_twice",
        severity="error",
        meaning="Two causes of a list have the same code.",
        found="{code} more than once",
        expected="a code of its own for each cause",
        remedy="Give one of them another code.",
        find=_doubled,
    ),
    Check(
        key="unknown_group",
        severity="error",
        meaning="A cause is part of a group that the list does not have.",
        found="{code} as part of {parent}",
        expected="the code of a row of the list",
        remedy="Add a row for the group, or correct its code.",
        find=_unknown_parent,
    ),
    Check(
        key="causes_in_a_circle",
        severity="error",
        meaning="A cause of a list is part of itself.",
        found="{code} as part of what is part of it",
        expected="groups that end at a top",
        remedy="Correct what the cause is part of.",
        find=_circle,
    ),
    Check(
        key="bad_code_range",
        severity="error",
        meaning="Codes of a cause cannot be read as codes or ranges of codes.",
        found="“{text}”",
        expected="codes such as I21, I20-I25, Y87.0, 410-414, parted by commas",
        remedy="Correct the codes.",
        find=_unreadable,
    ),
    Check(
        key="ranges_overlap",
        severity="error",
        meaning="Two causes of a list hold the same codes. A code of more digits inside a range of "
        "fewer is no overlap: it goes before.",
        found="codes of {code} that {other} holds too",
        expected="each code in one cause",
        remedy="Correct the ranges of one of them.",
        find=_overlap,
    ),
    Check(
        key="codes_in_no_cause",
        severity="warning",
        meaning="A list leaves out codes between those it holds; of ICD-10, codes that can be a "
        "cause of death. Deaths under them could not be read.",
        found="{count} ranges of codes in no cause: {codes}",
        expected="a cause for every code",
        remedy="Add them to a cause, if to one of all others.",
        find=_gaps,
    ),
)


def problems_of(own: OwnList) -> list[Problem]:
    return [problem for check in CHECKS for problem in check.problems(own)]
