"""How the text of a file falls into a heading, lines and fields."""

import csv
import io
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from server.intake.forms.delimiters import BLANKS, NAMES, delimited, without_blanks
from server.intake.forms.found import Found
from server.intake.forms.headings import joined
from server.intake.forms.opening import Opened, Tab, opened
from server.intake.mapping import Form
from server.intake.problems import Fault

NEWLINE, QUOTE = 10, 34
LONGEST_HEADING = 100_000  # signs looked at in the heading, and in the first rows


@dataclass(frozen=True, slots=True)
class Layout:
    """A file cut into a heading and lines; rows are counted as a spreadsheet counts them."""

    name: str
    form: Form  # as applied: encoding, delimiter and sheet as they were found
    encoding: str  # in words
    sure: tuple[str, ...]  # of encoding, delimiter and sheet: those not guessed
    columns: tuple[str, ...]
    top: tuple[tuple[str, ...], ...]  # rows above the heading
    body: bytes  # what follows the heading: UTF-8, lines ended by a line feed
    first: int  # row of the file in which the body begins
    ends: NDArray[np.int64]  # [line] where each line of the body ends
    fields: NDArray[np.int32]  # [line] how many fields it has; 0: a blank line
    stray: int  # row with a quotation mark that neither opens nor ends a field; 0: there is none
    tabs: tuple[Tab, ...] = ()  # sheets of a workbook
    found: tuple[Found, ...] = field(default=())

    @property
    def delimiter(self) -> str:
        return self.form.delimiter

    @property
    def row_count(self) -> int:
        """Rows below the heading, blank lines not counted."""
        return int(np.count_nonzero(self.fields))

    def row(self, line: int) -> int:
        """Row of the file of a line of the body."""
        return self.first + int(line)

    def first_rows(self, count: int) -> tuple[tuple[str, ...], ...]:
        """The first rows that are not blank, as text."""
        wanted = np.flatnonzero(self.fields)[:count]
        if not len(wanted):
            return ()
        start = self.body[: min(self.ends[wanted[-1]], LONGEST_HEADING)].decode(errors="replace")
        return tuple(row for row in rows_of(start, self.delimiter) if row)[:count]


def layout(content: bytes, name: str, form: Form | None = None) -> Layout:
    """Cut a file into heading, lines and fields, as `form` says or, where it says nothing, as the
    bytes themselves do. Never raises; what is wrong the checks of files find."""
    form = form or Form()
    source = opened(content, form)
    body, form, sure = _delimited(source, form)
    above, rows = max(form.heading, 1) - 1, max(form.heading_rows, 1)
    top, body, _ = _taken(body, above)
    heading, body, torn = _taken(body, rows)
    ends, fields, stray = _lines(body, form.delimiter)
    lines = [row for line in heading for row in rows_of(line, form.delimiter) or [()]]
    return Layout(
        name=f"{name} › {form.sheet}" if len(source.tabs) > 1 and form.sheet else name,
        form=form,
        encoding=source.label,
        sure=sure,
        columns=joined(lines),
        top=tuple(row for line in top for row in rows_of(line, form.delimiter)[:1] or [()]),
        body=body,
        first=above + rows + 1,
        ends=ends,
        fields=fields,
        stray=above + 1 if torn else stray and stray + above + rows,
        tabs=source.tabs,
        found=(*source.found, *_unknown(form)),
    )


def _unknown(form: Form) -> list[Found]:
    """A delimiter that is none, or rows of headings that cannot be."""
    if form.delimiter not in NAMES:
        return [Found("unknown_delimiter", Fault(values={"text": form.delimiter}))]
    return []


def _delimited(source: Opened, form: Form) -> tuple[bytes, Form, tuple[str, ...]]:
    """The text with one sign between its fields, and the form with all that was found out."""
    body, sure = source.body, [*source.sure]
    delimiter = source.delimiter or form.delimiter
    if not delimiter:
        cut = delimited(body, max(form.heading, 1) - 1)
        delimiter = cut.delimiter
        sure += ["delimiter"] if cut.sure else []
    else:
        sure.append("delimiter")
    if delimiter == BLANKS:
        body, delimiter = without_blanks(body), "\t"
    form = replace(form, delimiter=delimiter, encoding=source.encoding, sheet=source.sheet)
    return body, form, tuple(sure)


def rows_of(text: str, delimiter: str) -> list[tuple[str, ...]]:
    """Fields of some lines; of a field that is too long for the reader, nothing."""
    try:
        rows = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter or ",")
        return [tuple(row) for row in rows]
    except csv.Error:
        return []


def _taken(body: bytes, count: int) -> tuple[list[str], bytes, bool]:
    """The first rows as text, the rest, and whether some quotation mark in them has no partner."""
    rows, torn = [], False
    for _ in range(count):
        end = _row_end(body)
        torn |= end < 0
        line = body[: end if end >= 0 else None].partition(b"\n")[0] if end < 0 else body[:end]
        rows.append(line.decode(errors="replace")[:LONGEST_HEADING].replace("\0", " "))
        body = body[len(line) + 1 :]
    return rows, body, torn


def _row_end(body: bytes) -> int:
    """Where the first row ends: at a line feed outside quotation marks; -1 where there is none."""
    end = body.find(b"\n")
    while 0 <= end < LONGEST_HEADING and body.count(b'"', 0, end) % 2:
        end = body.find(b"\n", end + 1)
    whole = len(body) if end < 0 else end
    return -1 if body.count(b'"', 0, whole) % 2 else whole


def _lines(body: bytes, delimiter: str) -> tuple[NDArray[np.int64], NDArray[np.int32], int]:
    """Ends of the lines, fields in each, and the line (from 1) of the first stray quotation mark.

    Line feeds and delimiters inside quotes do not count; a doubled quote closes and opens at once.
    """
    if not body:
        return np.zeros(0, np.int64), np.zeros(0, np.int32), 0
    text = np.frombuffer(body, np.uint8)
    breaks, splits, stray = text == NEWLINE, text == ord(delimiter), -1
    if b'"' in body:
        stray = _stray(text, delimiter)
        outside = np.bitwise_xor.accumulate(text == QUOTE) ^ True
        breaks &= outside
        splits &= outside
    ends = np.flatnonzero(breaks)
    if not len(ends) or ends[-1] != len(text) - 1:
        ends = np.append(ends, len(text))
    starts = np.append(0, ends[:-1] + 1)
    fields = np.add.reduceat(splits, starts, dtype=np.int32) + 1
    fields[starts == ends] = 0
    line = 0 if stray < 0 else int(np.searchsorted(ends, stray)) + 1
    return ends, fields.astype(np.int32), line


def _stray(text: NDArray[np.uint8], delimiter: str) -> int:
    """Where the first quotation mark stands that neither opens nor ends a field; -1: nowhere."""
    marks = np.flatnonzero(text == QUOTE)
    framed = np.concatenate([[NEWLINE], text, [NEWLINE]])
    beside = np.array([NEWLINE, QUOTE, ord(delimiter)])
    opens, closes = marks[0::2], marks[1::2]
    wrong = np.concatenate(
        [
            opens[~np.isin(framed[opens], beside)],
            closes[~np.isin(framed[closes + 2], beside)],
            marks[-1:] if len(marks) % 2 else marks[:0],
        ]
    )
    return int(wrong.min()) if len(wrong) else -1
