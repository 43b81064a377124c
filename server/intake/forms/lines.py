"""A text cut into lines and fields, as quotation marks allow."""

import csv
import io
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

NEWLINE, QUOTE = 10, 34
LONGEST_HEADING = 100_000  # signs looked at in the heading, and in the first rows


@dataclass(frozen=True, slots=True)
class Lines:
    ends: NDArray[np.int64]  # [line] where it ends
    fields: NDArray[np.int32]  # [line] how many fields it has; 0: a blank line, or delimiters alone
    stray: int  # line, from 1, with a quotation mark that neither opens nor ends a field; 0: none

    @property
    def starts(self) -> NDArray[np.int64]:
        return np.append(0, self.ends[:-1] + 1)[: len(self.ends)]

    def first(self, count: int) -> "Lines":
        return Lines(self.ends[:count], self.fields[:count], self.stray)


def lines(body: bytes, delimiter: str) -> Lines:
    """Line feeds and delimiters inside quotes do not count; a doubled quote closes and opens at
    once."""
    if not body:
        return Lines(np.zeros(0, np.int64), np.zeros(0, np.int32), 0)
    text = np.frombuffer(body, np.uint8)
    breaks, splits = _marks(text, delimiter)
    ends = np.flatnonzero(breaks)
    if not len(ends) or ends[-1] != len(text) - 1:
        ends = np.append(ends, len(text))
    starts = np.append(0, ends[:-1] + 1)
    between = np.add.reduceat(splits, starts, dtype=np.int32)
    fields = between + 1
    fields[ends - starts == between] = 0
    stray = _stray(text, delimiter) if b'"' in body else -1
    line = 0 if stray < 0 else int(np.searchsorted(ends, stray)) + 1
    return Lines(ends, fields.astype(np.int32), line)


def filled(body: bytes, cut: Lines, delimiter: str, width: int) -> NDArray[np.bool_]:
    """Which columns hold anything, looked at in the lines that have as many fields as columns."""
    even = cut.fields == width
    if not even.any():
        return np.zeros(width, bool)
    text = np.frombuffer(body, np.uint8)
    splits = _marks(text, delimiter)[1]
    at = np.flatnonzero(splits)
    inner = at[even[np.searchsorted(cut.ends, at)]].reshape(-1, width - 1)
    edges = np.column_stack([cut.starts[even] - 1, inner, cut.ends[even]])
    return np.asarray((np.diff(edges) > 1).any(axis=0))


def _marks(text: NDArray[np.uint8], delimiter: str) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
    """Where lines end and fields part."""
    breaks, splits = text == NEWLINE, text == ord(delimiter)
    quotes = text == QUOTE
    if not quotes.any():
        return breaks, splits
    outside = np.bitwise_xor.accumulate(quotes) ^ True
    return breaks & outside, splits & outside


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


def rows_of(text: str, delimiter: str) -> list[tuple[str, ...]]:
    """Fields of some lines; of a field that is too long for the reader, nothing."""
    try:
        rows = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter)
        return [tuple(row) for row in rows]
    except csv.Error:
        return []


@dataclass(frozen=True, slots=True)
class Taken:
    """Rows taken from the start of a text."""

    rows: tuple[tuple[str, ...], ...]
    end: int  # where the next one begins
    torn: bool  # some quotation mark in them has no partner


def taken(body: bytes, start: int, count: int, delimiter: str) -> Taken:
    """Some rows from a place on, blank ones among them."""
    rows, torn, at = [], False, start
    for _ in range(count):
        if at >= len(body):
            break
        end = _row_end(body, at)
        torn |= end < 0
        if end < 0:
            end = body.find(b"\n", at)
            end = len(body) if end < 0 else end
        text = body[at : min(end, at + LONGEST_HEADING)].decode(errors="replace").replace("\0", " ")
        rows.append((rows_of(text, delimiter) or [()])[0])
        at = end + 1
    return Taken(tuple(rows), min(at, len(body)), torn)


def _row_end(body: bytes, start: int) -> int:
    """Where a row ends: at a line feed outside quotation marks; -1 where they do not pair."""
    end = start - 1
    while True:
        end = body.find(b"\n", end + 1)
        whole = len(body) if end < 0 else end
        paired = body.count(b'"', start, whole) % 2 == 0
        if paired or end < 0 or end - start > LONGEST_HEADING:
            return whole if paired else -1
