"""How the text of a file falls into a heading, lines and fields."""

from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from server.intake.forms.delimiters import BLANKS, NAMES, delimited, without_blanks
from server.intake.forms.found import Found
from server.intake.forms.headings import joined
from server.intake.forms.lines import LONGEST_HEADING, Lines, filled, lines, rows_of, taken
from server.intake.forms.notes import Notes, notes
from server.intake.forms.numbers import unknown_marks
from server.intake.forms.opening import Opened, opened
from server.intake.forms.sheet_notes import Filled, filled_down, told
from server.intake.forms.sheet_rows import Merged
from server.intake.forms.workbooks import Tab
from server.intake.mapping import Form
from server.intake.problems import Fault

MOST_ABOVE, MOST_HEADINGS = 1_000, 10  # rows
MOST_ROWS = 3_000_000
MOST_LINES = 2 * MOST_ROWS  # with those inside quotation marks, and blank ones


@dataclass(frozen=True, slots=True)
class Layout:
    """A file cut into a heading and lines; rows are counted as a spreadsheet counts them."""

    name: str
    form: Form  # as applied: encoding, delimiter and sheet as they were found
    encoding: str  # in words
    sure: tuple[str, ...]  # of encoding, delimiter and sheet: those not guessed
    delimiter: str  # between the fields of the body
    columns: tuple[str, ...]
    top: tuple[tuple[str, ...], ...]  # rows above the heading
    body: bytes  # what follows the heading: UTF-8, lines ended by a line feed
    first: int  # row of the file in which the body begins
    ends: NDArray[np.int64]  # [line] where each line of the body ends
    fields: NDArray[np.int32]  # [line] how many fields it has; 0: a blank line
    stray: int  # row with a quotation mark that neither opens nor ends a field; 0: there is none
    tabs: tuple[Tab, ...] = ()  # sheets of a workbook
    merged: tuple[Merged, ...] = ()  # cells of the body that were shown as one and filled down
    found: tuple[Found, ...] = field(default=())

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
        return tuple(row for row in rows_of(start, self.delimiter) if any(row))[:count]


def layout(content: bytes, name: str, form: Form | None = None) -> Layout:
    """Cut a file into heading, lines and fields, as `form` says or, where it says nothing, as the
    bytes themselves do. Never raises; what is wrong the checks of files find."""
    form = form or Form()
    return laid_out(opened(content, form), name, form)


def laid_out(source: Opened, name: str, form: Form) -> Layout:
    """A table that is opened already, cut."""
    source = _bounded(source)
    body, sign, form, sure = _delimited(source, form)
    above = min(max(form.heading, 1), MOST_ABOVE) - 1
    deep = min(max(form.heading_rows, 1), MOST_HEADINGS)
    top = taken(body, 0, above, sign)
    heading = taken(body, top.end, deep, sign)
    first = above + deep + 1
    sheet = _filled(source, body[heading.end :], first)
    body, cut = sheet.body, lines(sheet.body, sign)
    names = joined(heading.rows)
    found = [*source.found, *sheet.found, *_unknown(form), *unknown_marks(form)]
    if below := notes(body, cut, sign, len(names)):
        found.append(_left_out(below, cut, first))
        body, cut = body[: cut.starts[below.line]], cut.first(below.line)
    return Layout(
        name=f"{name} › {form.sheet}" if len(source.tabs) > 1 and form.sheet else name,
        form=form,
        encoding=source.label,
        sure=sure,
        delimiter=sign,
        columns=_all_named(names, body, cut, sign),
        top=top.rows,
        body=body,
        first=first,
        ends=cut.ends,
        fields=cut.fields,
        stray=above + 1 if top.torn or heading.torn else cut.stray and cut.stray + first - 1,
        tabs=source.tabs,
        merged=sheet.ranges,
        found=tuple(found),
    )


def _bounded(source: Opened) -> Opened:
    """Without its text where that has more lines than any table."""
    count = source.body.count(b"\n")
    if count <= MOST_LINES:
        return source
    fault = Fault(values={"count": count, "most": MOST_ROWS})
    return replace(source, body=b"", found=(Found("too_many_rows", fault),))


def _left_out(below: Notes, cut: Lines, first: int) -> Found:
    rows = int(np.count_nonzero(cut.fields[below.line :]))
    row, last = first + below.line, first + below.last
    fault = Fault(row=row, last_row=last, rows=rows, values={"text": below.text})
    return Found("notes_left_out", fault)


def _filled(source: Opened, body: bytes, first: int) -> Filled:
    """Of a workbook, with what is to be said of its cells."""
    if source.cells is None:
        return Filled(body, ())
    sheet = filled_down(body, source.cells.merged, first)
    return replace(sheet, found=(*sheet.found, *told(source.cells, first - 1)))


def _all_named(names: tuple[str, ...], body: bytes, cut: Lines, sign: str) -> tuple[str, ...]:
    """A column without a heading is called by its place; where it holds nothing either, it stays
    without a name and is left out."""
    if all(names) or not any(names):
        return names
    held = filled(body, cut, sign, len(names))
    return tuple(
        name or (f"column {place}" if held[place - 1] else "")
        for place, name in enumerate(names, start=1)
    )


def _unknown(form: Form) -> list[Found]:
    """A delimiter that is none, or a heading where none can be."""
    found = []
    if form.delimiter and form.delimiter not in NAMES:
        found.append(Found("unknown_delimiter", Fault(values={"text": form.delimiter})))
    if not (0 < form.heading <= MOST_ABOVE and 0 < form.heading_rows <= MOST_HEADINGS):
        values = {"row": form.heading, "rows": form.heading_rows, "most": MOST_ABOVE}
        found.append(Found("bad_heading_setting", Fault(values=values)))
    return found


def _delimited(source: Opened, form: Form) -> tuple[bytes, str, Form, tuple[str, ...]]:
    """The text, the sign between its fields, and the form with all that was found out."""
    body, sure, stated = source.body, list(source.sure), form.delimiter
    if source.delimiter:  # a workbook: no sign that could be chosen
        sign, stated = source.delimiter, ""
        sure.append("delimiter")
    elif not stated:
        cut = delimited(body, max(form.heading, 1) - 1)
        sign = stated = cut.delimiter
        sure += ["delimiter"] if cut.sure else []
    else:
        sign = stated if stated in NAMES else ","
        sure.append("delimiter")
    if sign == BLANKS:
        body, sign = without_blanks(body), "\t"
    form = replace(form, delimiter=stated, encoding=source.encoding, sheet=source.sheet)
    return body, sign, form, tuple(sure)
