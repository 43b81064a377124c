"""A first look at a handed-in file: its columns and first rows."""

from dataclasses import dataclass

from server.intake.checks import files
from server.intake.layout import DELIMITERS, layout
from server.intake.problems import Problem

SAMPLE = 8


@dataclass(frozen=True, slots=True)
class Reading:
    """What stands in the file, before anything is made of it."""

    name: str
    columns: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]  # the first ones, as text
    row_count: int  # below the heading
    delimiter: str  # the character
    delimiter_name: str  # comma, semicolon, tab
    encoding: str
    problems: tuple[Problem, ...]  # what keeps it from being read at all

    def values(self, column: str) -> tuple[str, ...]:
        """First values of a column."""
        place = self.columns.index(column)
        return tuple(row[place].strip() for row in self.rows if len(row) > place)


def read(content: bytes, name: str) -> Reading:
    """Look into a CSV file. Never raises: a file that cannot be read says why in `problems`."""
    file = layout(content, name)
    problems = tuple(files.problems_of(file))
    return Reading(
        name=name,
        columns=file.columns,
        rows=file.first_rows(SAMPLE),
        row_count=file.row_count,
        delimiter=file.delimiter,
        delimiter_name=DELIMITERS[file.delimiter],
        encoding=file.encoding,
        problems=problems,
    )
