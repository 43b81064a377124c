"""Checks of the counts that are moved to other codes: none is lost, none stands twice."""

from collections.abc import Iterable, Iterator

from engine.ages import AgeGrid
from server.intake.checks.check import Check
from server.intake.checks.successions import CHECKS as OF_ROWS
from server.intake.checks.successions import Said
from server.intake.problems import Fault, Problem, Text
from server.store.records import Key

RATES = ("deaths", "person_years")  # without which nothing can be computed


def _held(said: Said) -> dict[Key, AgeGrid]:
    return {**said.standing.held, **said.handed}


def _years(periods: Iterable[str]) -> str:
    listed = sorted(set(periods))
    return listed[0] if len(listed) == 1 else f"{listed[0]}–{listed[-1]}"


def _part_missing(said: Said) -> Iterator[Fault]:
    """Years in which some of the codes that are merged have counts and another has none."""
    held, meant = _held(said), said.meant
    found: dict[tuple[str, str, str, str], set[str]] = {}
    for key in held:
        one = meant.find(key.area, key.period) if key.measure in RATES else None
        for becomes in one.becomes if one and one.shares else ():
            for code in meant.before(becomes, key.period):
                other = Key(code, key.sex, key.period, key.measure, key.cause)
                if other not in held:
                    found.setdefault((becomes, key.area, code, key.measure), set()).add(key.period)
    for (becomes, has, lacks, measure), periods in sorted(found.items()):
        yield said.fault(
            said.row_of(lacks, becomes),
            "code",
            becomes=becomes,
            has=has,
            lacks=lacks,
            measure=_WORDS[measure],
            years=_years(periods),
        )


def _twice(said: Said) -> Iterator[Fault]:
    """New codes that are handed in for years for which they are made from handed-in old ones."""
    meant = said.meant
    found: dict[tuple[str, str], set[str]] = {}
    for key in said.handed:
        one = meant.find(key.area, key.period)
        for becomes in one.becomes if one and one.shares else ():
            made = Key(becomes, key.sex, key.period, key.measure, key.cause)
            stays = meant.find(becomes, key.period) is None
            if stays and becomes != key.area and made in said.handed:
                found.setdefault((key.area, becomes), set()).add(key.period)
    for (code, becomes), periods in sorted(found.items()):
        row = said.row_of(code, becomes)
        yield said.fault(row, "becomes", code=code, becomes=becomes, years=_years(periods))


def _own_counts(said: Said) -> Iterator[Fault]:
    """A code that stands for itself, gets part of another's counts, and has no row of its own."""
    meant = said.meant
    found: dict[tuple[str, str], set[str]] = {}
    for key in said.standing.held:
        one = meant.find(key.area, key.period)
        for becomes in one.becomes if one and one.shares else ():
            made = Key(becomes, key.sex, key.period, key.measure, key.cause)
            stays = becomes != key.area and meant.find(becomes, key.period) is None
            if stays and made in said.standing.held and made not in said.handed:
                found.setdefault((key.area, becomes), set()).add(key.period)
    for (code, becomes), periods in sorted(found.items()):
        row = said.row_of(code, becomes)
        yield said.fault(row, "becomes", code=code, becomes=becomes, years=_years(periods))


def _goes_on(said: Said) -> Iterator[Fault]:
    meant = said.meant
    found: dict[str, set[str]] = {}
    for key in said.handed:
        one = meant.find(key.area, key.period)
        if one is not None and not one.shares:
            found.setdefault(key.area, set()).add(key.period)
    for code, periods in sorted(found.items()):
        row = said.row_of(code)
        yield said.fault(row, "from", code=code, first=row.first, years=_years(periods))


def _too_fine(said: Said) -> Iterator[Fault]:
    """Shares by age that are finer than the counts they are of."""
    meant, told = said.meant, set()
    for key, grid in sorted(_held(said).items()):
        one = meant.find(key.area, key.period) if key.measure in RATES else None
        for share in one.shares_of(key) if one else ():
            finer = set(share.grid.starts) - set(grid.starts)
            if finer and (key.area, share.becomes) not in told:
                told.add((key.area, share.becomes))
                yield said.fault(
                    said.row_of(key.area, share.becomes),
                    "age",
                    code=key.area,
                    year=key.period,
                    age=min(finer),
                )


def _unshared(said: Said) -> Iterator[Fault]:
    """Counts of a code that is shared out for which no share is stated."""
    held, meant = _held(said), said.meant
    found: dict[tuple[str, str, str], set[str]] = {}
    for key in held:
        one = meant.find(key.area, key.period)
        sexes = [key._replace(sex=sex) for sex in ("f", "m")]
        summed = key.sex == "p" and all(sex in held for sex in sexes)
        if one and one.shares and not summed and not one.shares_of(key):
            found.setdefault((key.area, key.measure, key.sex), set()).add(key.period)
    for (code, measure, sex), periods in sorted(found.items()):
        values = {"code": code, "measure": _WORDS[measure], "sex": sex, "years": _years(periods)}
        yield said.fault(said.row_of(code), "share", **values)


_WORDS = {
    "deaths": Text("deaths"),
    "counted_deaths": Text("deaths"),
    "person_years": Text("population"),
    "births": Text("births"),
    "stillbirths": Text("stillbirths"),
    "neonatal_deaths": Text("deaths before 28 days"),
}


def _new_series(said: Said) -> Iterator[Fault]:
    for one in said.meant.of:
        if not one.shares:
            row, codes = said.row_of(one.code), ", ".join(one.becomes)
            yield said.fault(row, "share", code=one.code, codes=codes, year=one.first)


CHECKS: tuple[Check[Said], ...] = (
    Check(
        key="merged_part_missing",
        severity="error",
        meaning="Codes are merged in years in which one of them has no counts; the sum would be "
        "too low.",
        found="{measure} of {has} for {years}, none of {lacks}, and {becomes} made of both",
        expected="counts of every code that is merged",
        remedy="Hand in the missing counts, or narrow the years of the rows.",
        find=_part_missing,
    ),
    Check(
        key="moved_counts_twice",
        severity="error",
        meaning="A new code is handed in for years for which it would be made from old codes in "
        "the same upload.",
        found="counts of {becomes} and of {code} for {years}",
        expected="the old code or the new one in each year, not both",
        remedy="Take the counts of one of them out, or narrow the years of the row.",
        find=_twice,
    ),
    Check(
        key="moved_onto_counts",
        severity="error",
        meaning="Counts are moved to a code that has counts of its own for the same years, and it "
        "is not said that these are kept.",
        found="{becomes} with counts of its own for {years}, to which those of {code} would go",
        expected="a row that says what becomes of {becomes} itself",
        remedy="Add a row in which {becomes} becomes {becomes}, with the same years.",
        find=_own_counts,
    ),
    Check(
        key="ended_code_goes_on",
        severity="error",
        meaning="A code is handed in for years in which it is said to have ended.",
        found="counts of {code} for {years}",
        expected="none from {first} on, when new series begin",
        remedy="Hand these years in under the new codes, or correct the first year.",
        find=_goes_on,
    ),
    Check(
        key="shares_finer_than_counts",
        severity="error",
        meaning="Shares are stated for finer ages than the counts come in.",
        found="a share from age {age}, where the counts of {code} for {year} have no limit",
        expected="shares for age groups that the counts have",
        remedy="State shares for the age groups of the counts, or one for all ages.",
        find=_too_fine,
    ),
    Check(
        key="counts_without_share",
        severity="error",
        meaning="A code is shared out, and for some of its counts no share is stated.",
        found="{measure} of {code}, {sex}, for {years}, and no share of them",
        expected="a share of every count that the code has",
        remedy="Add rows for these counts, or leave counts and sex empty where one share is of "
        "all.",
        find=_unshared,
    ),
    Check(
        key="new_series_begin",
        severity="warning",
        meaning="One code becomes several without shares. The old series ends, new ones begin, and "
        "a break of boundaries is set, which no trend crosses.",
        found="{code} ended, and {codes} new from {year}",
        expected="shares, where the earlier years are to be carried on",
        remedy="Leave it so, or state the share of each new code.",
        find=_new_series,
    ),
)


def problems_of(said: Said) -> list[Problem]:
    """Of rows that contradict one another, only that."""
    found = [problem for check in OF_ROWS for problem in check.problems(said, said.table.name)]
    if found or not said.rows:
        return found
    return [problem for check in CHECKS for problem in check.problems(said, said.table.name)]
