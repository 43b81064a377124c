"""Checks of a file as such: is it a table of text at all."""

from collections.abc import Iterator

import numpy as np

from server.intake.checks import forms
from server.intake.checks.check import LISTED, Check
from server.intake.forms.found import faults
from server.intake.forms.sheet_rows import MOST_COLUMNS
from server.intake.layout import MOST_ROWS, Layout
from server.intake.problems import Fault, Problem


def _empty(file: Layout) -> Iterator[Fault]:
    if not file.body.strip() and not any(file.columns) and not file.top and not file.found:
        yield Fault()


def _no_rows(file: Layout) -> Iterator[Fault]:
    if not file.row_count:
        yield Fault(row=file.first - 1)


def _stray_quote(file: Layout) -> Iterator[Fault]:
    if file.stray:
        yield Fault(row=file.stray)


def _blank_heading(file: Layout) -> Iterator[Fault]:
    if not any(file.columns):
        yield Fault(row=file.form.heading)


def _too_many_columns(file: Layout) -> Iterator[Fault]:
    yield from faults(file.found, "too_many_columns")
    if len(file.columns) > MOST_COLUMNS:
        yield Fault(row=file.form.heading, values={"most": MOST_COLUMNS})


def _too_many_rows(file: Layout) -> Iterator[Fault]:
    yield from faults(file.found, "too_many_rows")
    if file.row_count > MOST_ROWS:
        yield Fault(values={"count": file.row_count, "most": MOST_ROWS})


def _uneven_rows(file: Layout) -> Iterator[Fault]:
    if file.stray:
        return
    wrong = np.flatnonzero((file.fields != len(file.columns)) & (file.fields != 0))
    counts = file.fields[wrong]
    for count in list(dict.fromkeys(counts.tolist()))[:LISTED]:
        lines = wrong[counts == count]
        yield Fault(
            row=file.row(lines[0]),
            last_row=file.row(lines[-1]),
            rows=len(lines),
            values={"count": count, "columns": len(file.columns)},
        )


CHECKS: tuple[Check[Layout], ...] = (
    Check(
        key="empty_file",
        severity="error",
        meaning="There is nothing in the file.",
        found="an empty file",
        expected="a heading and one row for each area, sex, year and age",
        remedy="Upload the file that holds the counts; the templates show the form.",
        find=_empty,
    ),
    Check(
        key="no_rows",
        severity="error",
        meaning="The file has a heading and nothing below it.",
        found="no row below the heading",
        expected="one row for each area, sex, year and age",
        remedy="Add the rows, or upload the file that holds them.",
        find=_no_rows,
    ),
    Check(
        key="stray_quote",
        severity="error",
        meaning="A quotation mark stands inside a field or has no partner, so that it is not known "
        "where the field ends.",
        found="a quotation mark that neither opens nor ends a field",
        expected="quotation marks in pairs round whole fields",
        remedy="Take the mark out; where it belongs to the text, double it and quote the field.",
        find=_stray_quote,
    ),
    Check(
        key="blank_heading",
        severity="error",
        meaning="The row taken for the heading is blank, so that no column has a name.",
        found="a blank heading",
        expected="names over the columns",
        remedy="Say in the mapping in which row the heading stands, or add one.",
        find=_blank_heading,
    ),
    Check(
        key="too_many_columns",
        severity="error",
        meaning="The file is wider than any table in long form.",
        found="more than {most} columns",
        expected="a few: area, sex, year, age and the counts",
        remedy="Give the table in long form: one row for each area, sex, year and age.",
        find=_too_many_columns,
    ),
    Check(
        key="too_many_rows",
        severity="error",
        meaning="The file is longer than one upload may be.",
        found="{count} rows",
        expected="at most {most}",
        remedy="Split the file by years and upload the parts one after the other.",
        find=_too_many_rows,
    ),
    Check(
        key="uneven_rows",
        severity="error",
        meaning="Rows have more or fewer fields than the heading, so that numbers may stand in "
        "the wrong column.",
        found="this many fields: {count}",
        expected="as many as in the heading: {columns}",
        remedy="Look for a delimiter inside a number or a name; take it out or put the field in "
        "quotation marks.",
        find=_uneven_rows,
    ),
)
KINDS = {check.key: check for check in (*forms.CHECKS, *CHECKS)}


def problems_of(file: Layout) -> list[Problem]:
    """All that is wrong with the file as a table of text; of what is no text, only that."""
    unopened = [one.key for one in file.found if KINDS[one.key].severity == "error"]
    for only in (*unopened, "empty_file", "blank_heading", "too_many_columns"):
        if problems := KINDS[only].problems(file, file.name):
            return problems
    return [problem for check in KINDS.values() for problem in check.problems(file, file.name)]
