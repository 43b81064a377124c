"""How the bytes of a delimited file fall into lines and fields."""

import csv
import io
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

DELIMITERS = {",": "comma", ";": "semicolon", "\t": "tab"}
BYTE_ORDER_MARK = b"\xef\xbb\xbf"
NEWLINE, QUOTE = 10, 34
LONGEST_HEADING = 100_000  # signs looked at in the heading, and in the first rows


@dataclass(frozen=True, slots=True)
class Layout:
    """A file cut into a heading and lines; rows are counted from the heading, which is row 1."""

    name: str
    content: bytes  # lines ended by a line feed, without byte order mark
    encoding: str
    columns: tuple[str, ...]
    delimiter: str
    body: bytes  # what follows the heading
    ends: NDArray[np.int64]  # [line] where each line of the body ends
    fields: NDArray[np.int32]  # [line] how many fields it has; 0: a blank line
    stray: int  # row with a quotation mark that neither opens nor ends a field; 0: there is none

    @property
    def row_count(self) -> int:
        """Rows below the heading, blank lines not counted."""
        return int(np.count_nonzero(self.fields))

    def first_rows(self, count: int) -> tuple[tuple[str, ...], ...]:
        """The first rows that are not blank, as text."""
        wanted = np.flatnonzero(self.fields)[:count]
        if not len(wanted):
            return ()
        start = self.body[: min(self.ends[wanted[-1]], LONGEST_HEADING)].decode(errors="replace")
        rows = csv.reader(io.StringIO(start, newline=""), delimiter=self.delimiter)
        return tuple(tuple(row) for row in rows if row)[:count]


def layout(content: bytes, name: str) -> Layout:
    """Cut a file into lines and fields. Never raises; what is wrong the checks of files find."""
    encoding = "UTF-8"
    if content.startswith(BYTE_ORDER_MARK):
        content, encoding = content[3:], "UTF-8 with byte order mark"
    if b"\r" in content:
        content = content.replace(b"\r\n", b"\n").replace(b"\r", b"\n")
    heading, body = _heading(content)
    delimiter = max(DELIMITERS, key=_outside_quotes(heading).count)
    ends, fields, stray = _lines(body, delimiter)
    columns = next(csv.reader([heading], delimiter=delimiter), [])
    return Layout(
        name=name,
        content=content,
        encoding=encoding,
        columns=tuple(column.strip() for column in columns),
        delimiter=delimiter,
        body=body,
        ends=ends,
        fields=fields,
        stray=1 if heading.count('"') % 2 else stray,
    )


def _heading(content: bytes) -> tuple[str, bytes]:
    """The first line as text, and the rest."""
    line, _, rest = content.partition(b"\n")
    return line.decode(errors="replace")[:LONGEST_HEADING].replace("\0", " "), rest


def _outside_quotes(line: str) -> str:
    return "".join(line.split('"')[::2])


def _lines(body: bytes, delimiter: str) -> tuple[NDArray[np.int64], NDArray[np.int32], int]:
    """Ends of the lines, fields in each, and the row of the first stray quotation mark.

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
    row = 0 if stray < 0 else int(np.searchsorted(ends, stray)) + 2
    return ends, fields.astype(np.int32), row


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
