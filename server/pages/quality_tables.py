"""The tables of a page of quality."""

import math
from collections import Counter
from collections.abc import Sequence
from dataclasses import replace
from itertools import groupby

from server.exports.table import Cell, Column, Gap, GapKind, Row, Table
from server.intake.checks import KINDS
from server.results.quality import Finding, Indices, Quality
from server.sentences import checks
from server.sentences import quality as say
from server.sentences.text import _
from server.store.records import Statement
from server.store.statements import QUESTIONS

MOST_ACROSS = 30  # years beside one another


def tables(found: Quality, said: Sequence[Statement], warnings: Counter[str]) -> tuple[Table, ...]:
    """Those that have rows; the statement always."""
    some = (
        by_year(found),
        findings(found),
        indices(found),
        committed(warnings),
    )
    return (*(table for table in some if table.rows), statement(said))


def by_year(found: Quality) -> Table:
    """Areas and years with the signs of what is known of each: the picture of the page."""
    years = tuple(
        Column(f"y{year}", year[2:], span=_("{decade}s", decade=f"{year[:3]}0"))
        for year in found.periods
    )
    return Table(
        "by_year",
        _("What is known of each area and year"),
        (Column("area", _("area")), *years),
        tuple(
            Row(
                (area.code, *(_signs(found, area.code, year) for year in found.periods)),
                shown=area.name,
            )
            for area in found.areas
        )
        if found.periods
        else (),
    )


def in_parts(table: Table) -> tuple[Table, ...]:
    """The picture cut into rows of decades, so that each is as wide as a page at most."""
    area, *years = table.columns
    parts: list[list[int]] = [[]]
    for _span, group in groupby(range(len(years)), key=lambda at: years[at].span):
        decade = list(group)
        if len(parts[-1]) + len(decade) > MOST_ACROSS and parts[-1]:
            parts.append([])
        parts[-1] += decade
    return tuple(
        replace(
            table,
            key=table.key if not number else f"{table.key}_{number + 1}",
            columns=(area, *(years[at] for at in part)),
            rows=tuple(
                replace(row, cells=(row.cells[0], *(row.cells[1 + at] for at in part)))
                for row in table.rows
            ),
        )
        for number, part in enumerate(parts)
        if part
    )


def signs(found: Quality) -> str:
    """All signs of the picture in a row."""
    cells = (_signs(found, *place) for place in found.places)
    return "".join(cell for cell in cells if isinstance(cell, str))


def _signs(found: Quality, area: str, year: str) -> Cell:
    one = found.places[area, year]
    if one.held == "none":
        return Gap(GapKind.NOT_AVAILABLE, _("nothing is held"))
    return say.mark(one.held, one.provisional, one.estimated, one.doubts)


def findings(found: Quality) -> Table:
    """What each check finds, without the counts it looked at."""
    return Table(
        "findings",
        _("What the checks find in the counts of this edition"),
        (
            Column("check", _("check")),
            Column("times", _("findings"), decimals=0),
            Column("areas", _("areas")),
            Column("years", _("years")),
            Column("remedy", _("what to do")),
        ),
        tuple(_found(found, one) for one in found.findings),
    )


def _found(found: Quality, one: Finding) -> Row:
    names = {area.code: area.name or area.code for area in found.areas}
    where = say.areas([names.get(code, code) for code in one.areas], len(found.areas))
    return Row(
        (one.key, one.times, where, say.years(one.years), _(KINDS[one.key].remedy)),
        href=f"/checks#{one.key}",
        shown=checks.name(one.key),
    )


def indices(found: Quality) -> Table:
    """Indices of stated ages, and of completeness, by area."""
    return Table(
        "indices",
        _("Indices of the counts, women and men together"),
        (
            Column("area", _("area")),
            Column("period", _("people of")),
            Column("whipple", _("Whipple"), _("100 is none"), decimals=0),
            Column("myers", _("Myers"), _("0 is none"), decimals=1),
            Column("accuracy", _("age and sex"), _("up to 20 good"), decimals=0),
            Column("registered", _("registered"), _("of 100 deaths"), decimals=0),
            Column("open_age", _("open age"), decimals=0),
            Column("open_share", _("deaths there"), _("of 100"), decimals=0),
        ),
        tuple(_indices(found, one) for one in found.indices if one.period or one.open_age),
        _(
            "Whipple's and Myers' indices: how much ages ending in 0 and 5, or in any digit, are "
            "liked; they need single years of age. Age and sex: the accuracy index of the United "
            "Nations, from 100,000 people on. Registered: by the general growth balance, for an "
            "area that is no part of another. Deaths at the open age: of all years together, from "
            "1,000 deaths on."
        ),
    )


def _indices(found: Quality, one: Indices) -> Row:
    name = next((area.name for area in found.areas if area.code == one.area), "")
    return Row(
        (
            one.area,
            one.period or Gap(GapKind.NOT_AVAILABLE),
            _number(one.whipple, 0, _("ages are not given in single years")),
            _number(one.myers, 1, _("ages are not given in single years")),
            _number(one.accuracy, 0, _("fewer than 100,000 people, or other age groups")),
            _number(one.registered, 0, _("part of another area, or too few years")),
            one.open_age or Gap(GapKind.NOT_AVAILABLE),
            _number(one.open_share, 0, _("fewer than 1,000 deaths")),
        ),
        shown=name,
    )


def _number(value: float, decimals: int, why: str) -> Cell:
    """Rounded as it is printed: no file tells more of the counts than the page."""
    if math.isnan(value):
        return Gap(GapKind.UNDEFINED, why)
    return round(value, decimals) + 0.0


def committed(warnings: Counter[str]) -> Table:
    """Warnings that stood in the report when the edition was made."""
    return Table(
        "warnings",
        _("Warnings with which the upload of this edition was committed"),
        (
            Column("check", _("check")),
            Column("times", _("times"), decimals=0),
            Column("meaning", _("what it means")),
        ),
        tuple(
            Row(
                (key, times, _(KINDS[key].meaning)),
                href=f"/checks#{key}",
                shown=checks.name(key),
            )
            for key, times in warnings.items()
        ),
    )


def statement(said: Sequence[Statement]) -> Table:
    """What is stated, question by question."""
    questions = say.questions()
    answers = said[0].answers if said else {}
    return Table(
        "statement",
        _("What the data owner states"),
        (Column("question", _("question")), Column("answer", _("answer"))),
        tuple(Row((questions[key], answers.get(key) or say.not_answered())) for key in QUESTIONS),
    )
