"""A first look at a handed-in file: its form as found, its columns and first rows."""

from collections.abc import Mapping as Mapped
from dataclasses import dataclass, field

from server.intake.checks import files
from server.intake.forms.delimiters import NAMES
from server.intake.forms.opening import Tab
from server.intake.layout import layout
from server.intake.mapping import Form
from server.intake.problems import Problem

SAMPLE = 8


@dataclass(frozen=True, slots=True)
class Question:
    """What the file does not say by itself: to be answered before its numbers are believed.

    `key` is a field of Form (encoding, delimiter, sheet, heading, decimal, thousands, across) or of
    Mapping (units, rate_is); the page words it from its key and `values`.
    """

    key: str
    proposal: str  # the answer to begin with
    choices: tuple[str, ...]  # the answers there are; empty: any text
    column: str = ""  # the column it was seen in
    likely: bool = True  # False: the proposal is no better than another
    values: Mapped[str, str] = field(default_factory=dict)  # evidence: an example, what it means


@dataclass(frozen=True, slots=True)
class Reading:
    """What stands in the file, before anything is made of it."""

    name: str
    form: Form  # as applied: what was handed in, filled with what was found or is proposed
    columns: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]  # the first ones below the heading, as text
    row_count: int  # below the heading
    delimiter: str  # the character; empty: a workbook
    delimiter_name: str  # comma, semicolon, tab, pipe, blanks; empty: a workbook
    encoding: str  # in words
    sure: tuple[str, ...]  # of encoding, delimiter, sheet, heading: those that are no guess
    sheets: tuple[Tab, ...]  # of a workbook: name, rows, columns, hidden
    top: tuple[tuple[str, ...], ...]  # rows above the heading
    questions: tuple[Question, ...]
    problems: tuple[Problem, ...]  # what keeps it from being read at all

    def values(self, column: str) -> tuple[str, ...]:
        """First values of a column."""
        place = self.columns.index(column)
        return tuple(row[place].strip() for row in self.rows if len(row) > place)


def read(content: bytes, name: str, form: Form | None = None) -> Reading:
    """Look into a file of any form. Without a form its own is proposed; what is no more than a
    proposal is asked. Never raises: a file that cannot be read says why in `problems`."""
    file = layout(content, name, form)
    found = tuple(files.problems_of(file))
    return Reading(
        name=file.name,
        form=file.form,
        columns=file.columns,
        rows=file.first_rows(SAMPLE),
        row_count=file.row_count,
        delimiter="" if file.tabs else file.delimiter,
        delimiter_name="" if file.tabs else NAMES.get(file.delimiter, ""),
        encoding=file.encoding,
        sure=file.sure,
        sheets=file.tabs,
        top=file.top,
        questions=(),
        problems=tuple(problem for problem in found if problem.severity == "error"),
    )
