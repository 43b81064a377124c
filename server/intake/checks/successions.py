"""Checks of what is said to become of areas: codes, years and shares that fit one another."""

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from itertools import combinations

from engine.ages import AgeGrid
from server.intake.checks.check import Check
from server.intake.lists import SmallTable
from server.intake.problems import Fault, Text, Value
from server.intake.standing import Standing
from server.intake.successions import (
    FIRST,
    Becoming,
    Successions,
    grid_of,
    is_new_series,
    runs,
    shares_of,
    successions,
)
from server.store.records import Area, Key

ROUNDING = 1e-9  # by which shares may miss 1


@dataclass(frozen=True, slots=True)
class Said:
    """The rows that can be read, beside what is handed in and what stands."""

    table: SmallTable
    rows: tuple[Becoming, ...]
    areas: Mapping[str, Area]  # handed in or standing, by code
    handed: Mapping[Key, AgeGrid]
    standing: Standing

    def fault(self, one: Becoming, field: str, **values: Value) -> Fault:
        column = self.table.column(field)
        return Fault(column=column, file=self.table.name, row=one.row, values=values)

    @property
    def meant(self) -> Successions:
        return successions(self.rows)

    def row_of(self, code: str, becomes: str = "") -> Becoming:
        return next(r for r in self.rows if r.code == code and becomes in ("", r.becomes))


def _span(one: Becoming) -> str:
    first = Text("the beginning") if one.first == FIRST else one.first
    return Text("{first} to {last}", first=first, last=_last(one))


def _last(one: Becoming) -> str:
    return Text("the end") if one.last == "9999" else one.last


def _unknown(said: Said) -> Iterator[Fault]:
    known = ", ".join(sorted(said.areas))[:200]
    told = set()
    for one in said.rows:
        if one.code not in said.areas and one.code not in told:
            told.add(one.code)
            yield said.fault(one, "code", code=one.code, known=known)


def _unknown_parent(said: Said) -> Iterator[Fault]:
    codes = {*said.areas, *(one.becomes for one in said.rows)}
    for one in said.rows:
        if one.parent and one.parent not in codes:
            known = ", ".join(sorted(codes))[:200]
            yield said.fault(one, "parent", code=one.parent, known=known)


def _wholes(said: Said) -> Iterator[Fault]:
    parents = {area.parent: area.code for area in said.areas.values() if area.parent}
    for one in said.rows:
        if one.code in parents:
            yield said.fault(one, "code", code=one.code, part=parents[one.code])


def _overlap(said: Said) -> Iterator[Fault]:
    spans: dict[str, list[Becoming]] = {}
    for run in runs(said.rows).values():
        spans.setdefault(run[0].code, []).append(run[0])
    for several in spans.values():
        for one, other in combinations(several, 2):
            if one.first <= other.last and other.first <= one.last:
                first, later = sorted((one, other), key=lambda row: row.row)
                values = {"code": one.code, "years": _span(later), "other": _span(first)}
                yield said.fault(later, "from", row=first.row, **values)


def _circle(said: Said) -> Iterator[Fault]:
    """A code that is said to become another may not itself be what a third becomes."""
    for one in said.rows:
        for other in said.rows:
            goes_on = one.becomes == other.code != other.becomes and one.code != one.becomes
            if goes_on and one.first <= other.last and other.first <= one.last:
                values = {"code": one.becomes, "further": other.becomes}
                yield said.fault(one, "becomes", row=other.row, **values)
                break


def _share_missing(said: Said) -> Iterator[Fault]:
    for run in runs(said.rows).values():
        several = len({one.becomes for one in run}) > 1
        if several and not is_new_series(run):
            for one in run:
                if one.share is None:
                    yield said.fault(one, "share", code=one.code, becomes=one.becomes)


def _no_first_year(said: Said) -> Iterator[Fault]:
    for run in runs(said.rows).values():
        if is_new_series(run) and run[0].first == FIRST:
            yield said.fault(run[0], "from", code=run[0].code, codes=_codes(run))


def _codes(run: Iterable[Becoming]) -> str:
    return ", ".join(dict.fromkeys(one.becomes for one in run))


def _ages(said: Said) -> Iterator[Fault]:
    """Ages of a share that leave a gap, or are others than those of the code beside it."""
    for run in runs(said.rows).values():
        if is_new_series(run):
            continue
        grids: dict[tuple[str, str], AgeGrid] = {}
        for (becomes, counts, sex), rows in shares_of(run).items():
            grid = grid_of(rows)
            if grid is None or grids.setdefault((counts, sex), grid) != grid:
                yield said.fault(rows[0], "age", becomes=becomes, code=rows[0].code)


def _not_one(said: Said) -> Iterator[Fault]:
    for run in runs(said.rows).values():
        unstated = any(one.share is None for one in run)
        if is_new_series(run) or (unstated and len(run) > 1):
            continue
        sums: dict[tuple[str, str, int], list[Becoming]] = {}
        for one in run:
            start = 0 if one.age is None else one.age.start
            sums.setdefault((one.counts, one.sex, start), []).append(one)
        for rows in sums.values():
            shares = [1.0 if one.share is None else one.share for one in rows]
            if abs(sum(shares) - 1) > ROUNDING:
                values = {"code": rows[0].code, "sum": f"{sum(shares):.12g}", "codes": _codes(rows)}
                yield said.fault(rows[-1], "share", **values)


def _sexes(said: Said) -> Iterator[Fault]:
    """Shares of one sex without those of the other, and no share for both."""
    for run in runs(said.rows).values():
        stated = {(one.counts, one.sex) for one in run}
        for counts in {counts for counts, _ in stated}:
            sexes = {sex for kind, sex in stated if kind == counts}
            if len(sexes & {"f", "m"}) == 1 and "" not in sexes:
                missing = "m" if "f" in sexes else "f"
                yield said.fault(run[0], "sex", code=run[0].code, missing=missing)


CHECKS: tuple[Check[Said], ...] = (
    Check(
        key="unknown_old_code",
        severity="error",
        meaning="A table of areas over time speaks of a code that has no counts, neither in the "
        "upload nor in the edition that stands.",
        found="the code {code}",
        expected="a code that has counts: {known}",
        remedy="Correct the code, or take the row out.",
        find=_unknown,
    ),
    Check(
        key="unknown_new_parent",
        severity="error",
        meaning="A new code is said to be part of an area that there is not.",
        found="part of {code}",
        expected="one of {known}",
        remedy="Correct the code, or leave the field empty: the new code then belongs where the "
        "old ones do.",
        find=_unknown_parent,
    ),
    Check(
        key="whole_becomes",
        severity="error",
        meaning="An area that is summed from its parts is said to become another.",
        found="{code}, of which {part} is part",
        expected="a code without parts",
        remedy="Say it of each of its parts; the whole follows.",
        find=_wholes,
    ),
    Check(
        key="years_overlap",
        severity="error",
        meaning="Two rows say of one code and the same years what becomes of it.",
        found="{code} from {years}",
        expected="years that lie outside those of row {row}, {other}",
        remedy="Part the years, or give both rows the same years and a share each.",
        find=_overlap,
    ),
    Check(
        key="becomes_in_a_circle",
        severity="error",
        meaning="A code is said to become one that itself becomes another in the same years, so "
        "that it is not known where the counts end.",
        found="{code}, which by row {row} becomes {further}",
        expected="a code that stays what it is",
        remedy="Name the code at the end in each row; where two codes were exchanged, hand the "
        "counts in under their new codes.",
        find=_circle,
    ),
    Check(
        key="share_missing",
        severity="error",
        meaning="The counts of one code go to several, and not each of them has a share.",
        found="no share of {code} for {becomes}",
        expected="a share in each row, or in none",
        remedy="State the share; without any, the old series ends and new ones begin.",
        find=_share_missing,
    ),
    Check(
        key="new_series_without_year",
        severity="error",
        meaning="One code becomes several without shares, and the first year of the new ones is "
        "not said.",
        found="no first year for {codes}, which {code} becomes",
        expected="the first year in which the new codes hold",
        remedy="Add the year, or a share for each new code.",
        find=_no_first_year,
    ),
    Check(
        key="share_ages",
        severity="error",
        meaning="Shares by age leave an age out, overlap, or come in other ages for one new code "
        "than for another.",
        found="ages of the shares of {code} for {becomes}",
        expected="every age from 0 to the open one, once, and the same for each new code",
        remedy="Add the missing ages, or state one share for all ages.",
        find=_ages,
    ),
    Check(
        key="shares_not_one",
        severity="error",
        meaning="The shares of a code do not add up to 1, so that counts would be lost or made.",
        found="{sum}, the sum of the shares of {code} for {codes}",
        expected="1, to a thousand-millionth",
        remedy="Correct a share, or add the row that is missing; thirds are written 1/3.",
        find=_not_one,
    ),
    Check(
        key="share_of_one_sex",
        severity="error",
        meaning="Shares are stated for one sex alone.",
        found="no share of {code} for the sex {missing}",
        expected="shares for f and for m, or for both together",
        remedy="Add the rows of the other sex, or leave the sex empty.",
        find=_sexes,
    ),
)
