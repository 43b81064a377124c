"""Checks of a file as such: is it a table of text at all."""

from collections import Counter
from collections.abc import Callable, Iterator

import numpy as np

from server.intake.checks.check import LISTED, Check
from server.intake.forms.found import faults
from server.intake.layout import Layout
from server.intake.problems import Fault, Problem

MOST_ROWS = 3_000_000
MOST_COLUMNS = 2_000


def _told(key: str) -> Callable[[Layout], list[Fault]]:
    """What was found while the file was opened."""
    return lambda file: faults(file.found, key)


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


def _doubled_heading(file: Layout) -> Iterator[Fault]:
    for column, count in list(Counter(file.columns).items())[:MOST_COLUMNS]:
        if column and count > 1:
            yield Fault(column=column, row=file.form.heading, values={"count": count})


def _too_many_columns(file: Layout) -> Iterator[Fault]:
    if len(file.columns) > MOST_COLUMNS:
        yield Fault(row=file.form.heading, values={"most": MOST_COLUMNS})


def _too_many_rows(file: Layout) -> Iterator[Fault]:
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
        key="not_text",
        severity="error",
        meaning="The file is not a table of text.",
        found="{what}",
        expected="a CSV file: lines of text, fields between commas, semicolons or tabs",
        remedy="Save the table as CSV with the encoding UTF-8 and upload that file.",
        find=_told("not_text"),
    ),
    Check(
        key="broken_package",
        severity="error",
        meaning="A file packed with gzip is damaged or cut short.",
        found="{packed} bytes that cannot be unpacked to their end",
        expected="a whole file packed with gzip, or the file itself",
        remedy="Pack the file again, or upload it unpacked.",
        find=_told("broken_package"),
    ),
    Check(
        key="package_too_large",
        severity="error",
        meaning="A packed file would grow beyond what one upload may hold.",
        found="{packed} bytes that unpack to more than {most}",
        expected="at most {most} bytes unpacked",
        remedy="Split the file by years and upload the parts one after the other.",
        find=_told("package_too_large"),
    ),
    Check(
        key="package_in_package",
        severity="error",
        meaning="A packed file holds another packed file.",
        found="a packed file inside a packed file",
        expected="a table of text inside, packed once",
        remedy="Unpack the file, and upload what is inside.",
        find=_told("package_in_package"),
    ),
    Check(
        key="unknown_encoding",
        severity="error",
        meaning="The mapping names an encoding that is not known here.",
        found="“{encoding}” as the encoding",
        expected="one of {known}",
        remedy="Correct the mapping.",
        find=_told("unknown_encoding"),
    ),
    Check(
        key="wrong_encoding",
        severity="error",
        meaning="Letters of the file are stored in another encoding than the one it is read with, "
        "or in two different ones.",
        found="the byte {byte}, which has no meaning there",
        expected="text in the encoding {encoding}",
        remedy="Say in the mapping which encoding it is, or save the file again with the encoding "
        "UTF-8.",
        find=_told("wrong_encoding"),
    ),
    Check(
        key="encoding_guessed",
        severity="warning",
        meaning="The file does not say how its letters are stored and is no UTF-8, so that its "
        "encoding was guessed.",
        found="letters read as {encoding}: “{text}”",
        expected="an encoding that is stated or shows in the bytes",
        remedy="Look whether the letters are right; if not, say in the mapping which encoding it "
        "is.",
        find=_told("encoding_guessed"),
    ),
    Check(
        key="unknown_delimiter",
        severity="error",
        meaning="The mapping names a sign between fields that cannot be one.",
        found="“{text}” as the sign between fields",
        expected="a comma, a semicolon, a tab, a pipe or a blank",
        remedy="Correct the mapping.",
        find=_told("unknown_delimiter"),
    ),
    Check(
        key="bad_heading_setting",
        severity="error",
        meaning="The mapping names a row for the heading where none can stand.",
        found="the heading in row {row}, of {rows} rows",
        expected="a row from 1 to {most}, and 1 to 10 rows",
        remedy="Correct the mapping.",
        find=_told("bad_heading_setting"),
    ),
    Check(
        key="unknown_marks",
        severity="error",
        meaning="The mapping names marks of numbers that cannot be, or one mark for two things.",
        found="“{decimal}” before decimals and “{thousands}” between thousands",
        expected="a full stop or a comma before decimals, and another mark or none between "
        "thousands",
        remedy="Correct the mapping.",
        find=_told("unknown_marks"),
    ),
    Check(
        key="notes_left_out",
        severity="warning",
        meaning="Rows below the table hold text and no counts. They are taken for notes and left "
        "out.",
        found="“{text}”",
        expected="rows of counts down to the end, or notes",
        remedy="Look whether they are notes. If not, fill in what these rows lack.",
        find=_told("notes_left_out"),
    ),
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
        key="doubled_heading",
        severity="error",
        meaning="Two columns have the same name, so that it is not known which is meant.",
        found="this name over {count} columns",
        expected="a name of its own over each column",
        remedy="Rename or take out all but one of them.",
        find=_doubled_heading,
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
KINDS = {check.key: check for check in CHECKS}


def problems_of(file: Layout) -> list[Problem]:
    """All that is wrong with the file as a table of text; of what is no text, only that."""
    unopened = [one.key for one in file.found if KINDS[one.key].severity == "error"]
    for only in (*unopened, "empty_file", "blank_heading", "too_many_columns"):
        if problems := KINDS[only].problems(file, file.name):
            return problems
    return [problem for check in CHECKS for problem in check.problems(file, file.name)]
