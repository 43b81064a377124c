"""Checks of the age groups of one area, sex and year: no gap, no overlap, an open end."""

from collections.abc import Iterator

import numpy as np

from engine.panel import SEXES
from server.intake.cells import Flags, Ints, parts_of
from server.intake.checks.check import Marks, RowCheck
from server.intake.labels import NOT_STATED
from server.intake.schedules import Ordered


def _next(rows: Ordered) -> Ints:
    """Start of the next row's group, [row]; of the last row, nonsense."""
    return np.roll(rows.start, -1)


def _doubled(rows: Ordered) -> Flags:
    """Rows with the same place and age as the row before."""
    return np.asarray(~rows.first & (rows.start == np.roll(rows.start, 1)), bool)


def _pairs(rows: Ordered) -> Flags:
    """Rows followed by another age of their place, where nothing unread can stand between."""
    return ~rows.last & ~rows.broken & ~np.roll(_doubled(rows), -1)


def _ends(rows: Ordered) -> Ints:
    """Last age of each row's group, -1 where nothing says it. Beside ranges, a label without an end
    is a single year of age: the 0 before 1-4."""
    ranged = np.isin(rows.place, rows.place[rows.end >= 0])
    return np.where(ranged & (rows.end < 0), rows.start, rows.end)


def _closed(rows: Ordered) -> Flags:
    """A next age that is too far off: after a group with an end, not the age after it; after one
    without, no step that single years, 1-4, five or ten years of age take, or a step wider than the
    one that follows it."""
    end, step = _ends(rows), _next(rows) - rows.start
    usual = (
        (step == 1)
        | ((step == 4) & (rows.start == 1))
        | (((step == 5) | (step == 10)) & (rows.start % 5 == 0))
    )
    to_last = np.roll(rows.last, -1)
    narrows = (np.roll(step, -1) < step) & ~to_last
    widens = (np.roll(step, 1) < step) & ~rows.first & to_last & (rows.start >= 10)
    return np.where(end >= 0, _next(rows) > end + 1, ~usual | narrows | widens)


def _column(rows: Ordered) -> str:
    return rows.cells.sheet.mapping.age


def _duplicate(rows: Ordered) -> Iterator[Marks]:
    failing = _doubled(rows)
    if failing.any():
        places, which = np.unique(rows.place[failing], return_inverse=True)
        _, sexes, years = parts_of(places)
        named = (*SEXES, NOT_STATED)
        what = [f"{named[sex]} {year}" for sex, year in zip(sexes, years, strict=True)]
        yield Marks(
            _column(rows),
            failing,
            {"text": rows.label(failing), "what": np.array(what, object)[which]},
        )


def _pair_marks(rows: Ordered, wrong: Flags) -> Iterator[Marks]:
    """Marks the second row of each pair."""
    before = np.flatnonzero(wrong)
    if len(before):
        failing = np.zeros(len(wrong), bool)
        failing[before + 1] = True
        found = {"text": rows.label(before), "next": rows.label(before + 1)}
        yield Marks(_column(rows), failing, found)


def _gap(rows: Ordered) -> Iterator[Marks]:
    return _pair_marks(rows, _pairs(rows) & rows.stated & ~rows.open & ~rows.parted & _closed(rows))


def _overlap(rows: Ordered) -> Iterator[Marks]:
    over = rows.open | ((rows.end >= 0) & (_next(rows) <= rows.end))
    return _pair_marks(rows, _pairs(rows) & over)


def _late_start(rows: Ordered) -> Iterator[Marks]:
    failing = rows.first & rows.stated & ~rows.broken & ~rows.parted_before & (rows.start != 0)
    if failing.any():
        yield Marks(_column(rows), failing, {"text": rows.label(failing)})


def _no_open_interval(rows: Ordered) -> Iterator[Marks]:
    failing = rows.last & rows.stated & ~rows.broken & ~rows.parted & ~rows.open
    if failing.any():
        start = rows.start[failing].astype(str).astype(object)
        yield Marks(_column(rows), failing, {"text": rows.label(failing), "start": start})


CHECKS: tuple[RowCheck[Ordered], ...] = (
    RowCheck(
        key="duplicate_cell",
        severity="error",
        meaning="The same area, sex, year and age stands in the file twice.",
        found="“{text}” a second time ({what})",
        expected="one row for each area, sex, year and age",
        remedy="Take one of the rows out; add up rows that were split by another column.",
        mark=_duplicate,
    ),
    RowCheck(
        key="gap_of_ages",
        severity="error",
        meaning="Age groups do not follow one another: an age is missing between two of them.",
        found="“{text}” and then “{next}”",
        expected="each group to begin where the one before ends",
        remedy="Add the missing ages, with 0 where there was none; write wide groups as ranges "
        "(15–44).",
        mark=_gap,
    ),
    RowCheck(
        key="overlap_of_ages",
        severity="error",
        meaning="Age groups overlap, so that some ages are counted twice.",
        found="“{text}” and then “{next}”",
        expected="each group to begin where the one before ends",
        remedy="Take out the groups that are sums of others.",
        mark=_overlap,
    ),
    RowCheck(
        key="ages_start_late",
        severity="error",
        meaning="The first age group does not begin at birth.",
        found="“{text}” as the first age",
        expected="a first group that begins at age 0",
        remedy="Add the younger ages.",
        mark=_late_start,
    ),
    RowCheck(
        key="no_open_interval",
        severity="error",
        meaning="The last age group is not marked as open, so that the oldest seem to be missing.",
        found="“{text}” as the last age",
        expected="an open group, such as {start}+",
        remedy="Mark the open group with +, or say in the mapping that the last age is open.",
        mark=_no_open_interval,
    ),
)
