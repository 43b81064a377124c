"""Notes below a table: rows that hold a text and no count."""

import re
from dataclasses import dataclass

import numpy as np

from server.intake.forms.lines import Lines, rows_of

MOST = 40  # rows of notes looked for below a table
SHOWN = 60  # signs of the first note that are shown
_BEGINS = re.compile(r"[*†‡§¹²³⁴]|\(?\d{1,2}[).]\s?[^\W\d]|[^\W\d][^\d:]{1,30}:\s|https?:")
_LETTER = re.compile(r"[^\W\d_]")
LONG, WORDS = 25, 3  # signs and words beyond which a text is no label


@dataclass(frozen=True, slots=True)
class Notes:
    line: int  # of the body in which they begin, from 0
    last: int
    text: str


def notes(body: bytes, cut: Lines, delimiter: str, width: int) -> Notes | None:
    """Rows at the end that are plainly notes: a text in a single field that a blank row parts from
    the table or that is worded as a note, or a worded text that its own commas cut."""
    filled = np.flatnonzero(cut.fields)
    starts, found, begun = cut.starts, None, None
    for at in filled[::-1][:MOST].tolist():
        text = _text(body[starts[at] : cut.ends[at]], int(cut.fields[at]), delimiter, width)
        if not text:
            break
        found = Notes(at, int(filled[-1]), text[:SHOWN])
        if _worded(text) or (at and not cut.fields[at - 1]):
            begun = found
    return begun if begun and begun.line > filled[0] else None


def _text(line: bytes, fields: int, delimiter: str, width: int) -> str:
    """The text of a row without counts; '' where it may be one of the table."""
    written = line.decode(errors="replace").strip()
    row = (rows_of(written, delimiter) or [()])[0]
    held = [cell.strip() for cell in row if cell.strip()]
    if len(held) == 1 and row[0].strip():
        text = held[0]
    elif fields != width and len(held) > 1 and _worded(written):
        text = written.rstrip(delimiter)
    else:
        return ""
    letters = len(_LETTER.findall(text))
    return text if 2 * letters >= len(text.replace(" ", "")) and letters > 1 else ""


def _worded(text: str) -> bool:
    """Whether a text begins or reads like a note, and not like a label of the table."""
    return bool(_BEGINS.match(text)) or (len(text) >= LONG and len(text.split()) > WORDS)
