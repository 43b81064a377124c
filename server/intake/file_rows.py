"""The rows of one file checked one by one and age by age, and cut into vectors."""

from dataclasses import dataclass, replace

import numpy as np

from server.intake.causes.items import items_of
from server.intake.causes.parting import ByCause, Rows, put_together, rows_of
from server.intake.causes.placing import CauseList
from server.intake.cells import TOTAL, UNSTATED, Cells, Flags, Ints
from server.intake.checks import ages, cause_rows, fields
from server.intake.problems import Problem
from server.intake.schedules import Aside, Block, asides, blocks, groups, ordered


@dataclass(frozen=True, slots=True)
class FileRows:
    """One file as far as it could be read."""

    problems: list[Problem]
    sound_rows: Flags  # [row]
    blocks: list[Block]
    spoiled: Ints  # places with errors, or with a count that is not known
    unknown: Ints  # of them those without an error
    unplaced: bool
    age_totals: list[Aside]
    ageless: list[Aside]  # counts of unknown age
    grouped: list[Aside]  # counts by age whose area or sex is not known
    by_cause: ByCause | None = None


def sorted_out(read: Cells, causes: CauseList | None = None) -> FileRows:
    """Check a sheet row by row and age by age, and cut what is sound into vectors; rows by cause
    are first made one row for all causes."""
    rows = None
    if causes is not None and (labels := read.sheet.labels.get("cause")):
        rows = rows_of(read, items_of(labels.texts, causes))
        read = rows.cells
    problems, fields_of = _checked(read)
    sound = fields_of.sound
    if rows is None:
        return _cut(read, fields_of, problems)
    problems += _checked_causes(rows, sound)
    read, by_cause = put_together(rows)
    together = _Fields(*(_all(rows, of) for of in (fields_of.labelled, sound, fields_of.known)))
    found = _cut(read, together, problems, by_cause)
    whole = found.sound_rows[rows.cell] & sound
    return replace(found, sound_rows=whole)


@dataclass(frozen=True, slots=True)
class _Fields:
    """What holds of the rows as far as each field tells by itself, [row]."""

    labelled: Flags  # every label could be read
    sound: Flags  # there is no error
    known: Flags  # no count is said to be not available, or withheld


def _checked(read: Cells) -> tuple[list[Problem], _Fields]:
    """Problems of single fields."""
    sheet = read.sheet
    problems: list[Problem] = []
    labelled, sound, known = (np.ones(len(sheet), bool) for _ in range(3))
    for field_check in fields.CHECKS:
        for marks in field_check.mark(read):
            problems += field_check.problems(marks, sheet.row, sheet.name)
            (sound if field_check.severity == "error" else known)[marks.failing] = False
            if field_check.key not in fields.OF_NUMBERS:
                labelled &= ~marks.failing
    return problems, _Fields(labelled, sound, known)


def _checked_causes(rows: Rows, sound: Flags) -> list[Problem]:
    """Problems of causes; rows with an error are taken out of the sound ones."""
    sheet = rows.cells.sheet
    problems: list[Problem] = []
    for check in cause_rows.CHECKS:
        for marks in check.mark(rows):
            problems += check.problems(marks, sheet.row, sheet.name)
            if check.severity == "error":
                sound &= ~marks.failing
    return problems


def _all(rows: Rows, of: Flags) -> Flags:
    """Whether something holds of all rows of a cell, [cell]."""
    return np.asarray(np.bincount(rows.cell[~of], minlength=len(rows.head)) == 0)


def _cut(
    read: Cells,
    of: _Fields,
    problems: list[Problem],
    by_cause: ByCause | None = None,
) -> FileRows:
    rows, sound = ordered(read, of.labelled), of.sound
    failing = np.zeros(len(rows.take), bool)
    for age_check in ages.CHECKS:
        for marks in age_check.mark(rows):
            problems += age_check.problems(marks, rows.row, read.sheet.name)
            failing |= marks.failing
    sound[rows.take[failing]] = False
    torn = rows.place[rows.parted | rows.parted_before]  # rows of theirs may be the unplaced ones
    faulty = np.unique(np.concatenate([read.place[read.placed & ~sound], torn]))
    # a total that is not known leaves the counts it is of as they are
    lacking = read.place[read.placed & ~of.known & (read.start != TOTAL)]
    spoiled, told = np.union1d(faulty, lacking), sound & of.known
    return FileRows(
        problems=problems,
        sound_rows=sound,
        blocks=list(blocks(rows, spoiled)),
        spoiled=spoiled,
        unknown=np.setdiff1d(lacking, faulty),
        unplaced=not read.placed.all(),
        age_totals=list(asides(read, read.placed & told & (read.start == TOTAL))),
        ageless=list(asides(read, read.placed & told & (read.start == UNSTATED), None)),
        grouped=list(groups(rows, spoiled)),
        by_cause=by_cause,
    )
