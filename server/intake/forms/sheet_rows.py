"""The cells of one sheet of a workbook, read piece by piece into rows of text."""

import re
from collections.abc import Callable
from dataclasses import dataclass, field

from server.intake.forms.dates import date_of
from server.intake.forms.packages import Broken, Package, local
from server.intake.forms.unpacking import MOST_UNPACKED
from server.intake.problems import Text

BETWEEN = "\x1f"  # between fields: a sign that no cell can hold
LAST_ROW, LAST_COLUMN = 1_048_576, 16_384  # of any sheet
MOST_COLUMNS = 2_000  # of a table
MOST_MERGED = 20_000
LISTED = 100  # cells that are named one by one
MOST_PIECES = 1_000  # of a text, each of some thousand signs
KEPT = 10_000  # texts of which it is known how they are written
MARKED = 2_000  # different texts that may be numbers
_MAY_BE_NUMBER = re.compile(r"[+-]?\d[\d.,' \u00a0\u2009\u202f\u2019]*")
_REFERENCE = re.compile(r"([A-Z]{1,3})(\d{1,7})")
_ESCAPED = re.compile(r"_x([0-9A-Fa-f]{4})_")


class TooLarge(Exception):
    """A sheet holds more text than an upload may."""


class TooWide(Exception):
    """A row of a sheet, its argument, has more fields than any table."""


@dataclass(frozen=True, slots=True)
class Book:
    """What the sheets of a workbook share."""

    texts: list[str]  # as they are written into a table
    dates: frozenset[int]  # styles of cells that show a date
    from_1904: bool


@dataclass(frozen=True, slots=True)
class Merged:
    """A range of cells shown as one: rows and columns from 1."""

    row: int
    column: int
    last_row: int
    last_column: int


@dataclass(slots=True)
class SheetRows:
    """Rows of a sheet: fields between BETWEEN, and what is special about some of its cells."""

    rows: list[str] = field(default_factory=list)
    width: int = 0
    hidden: list[int] = field(default_factory=list)  # rows with cells
    hidden_columns: list[int] = field(default_factory=list)
    formulas: int = 0  # cells with one
    valueless: list[str] = field(default_factory=list)  # first cells with a formula and no value
    merged: list[Merged] = field(default_factory=list)
    marked: dict[str, None] = field(default_factory=dict)  # own texts that may be numbers


def sheet_rows(package: Package, part: str, book: Book, decimal: str) -> SheetRows:
    """All rows down to the last with a cell. Raises: Broken, TooLarge, TooWide."""
    reader = _Reader(book, decimal)
    package.parse(part, reader.begin, reader.end, reader.text)
    return reader.sheet


def place(reference: str) -> tuple[int, int]:
    """Row and column of a cell, from 1. Raises: Broken.

    >>> place("AB12")
    (12, 28)
    """
    match = _REFERENCE.fullmatch(reference)
    if not match:
        raise Broken(reference)
    column = 0
    for letter in match[1]:
        column = column * 26 + ord(letter) - 64
    row = int(match[2])
    if not (0 < row <= LAST_ROW and column <= LAST_COLUMN):
        raise Broken(reference)
    return row, column


def letters(column: int) -> str:
    """A column as a spreadsheet names it.

    >>> letters(28)
    'AB'
    """
    name = ""
    while column:
        column, rest = divmod(column - 1, 26)
        name = chr(65 + rest) + name
    return name


def written(text: str) -> str:
    """A text on one line, with its escapes undone, quoted where it has to be."""
    if "_x" in text:
        text = _ESCAPED.sub(lambda match: chr(int(match[1], 16)), text)
    text = " ".join(text.replace(BETWEEN, " ").replace("\0", " ").split())
    return '"' + text.replace('"', '""') + '"' if '"' in text else text


def may_be_number(text: str) -> bool:
    return _MAY_BE_NUMBER.fullmatch(text) is not None


def number_text(value: str, decimal: str = ".") -> str:
    """A number of a sheet as text: whole ones without decimals, others with all they need.

    >>> number_text("2014.0"), number_text("0.30000000000000004"), number_text("1.5", ",")
    ('2014', '0.30000000000000004', '1,5')
    """
    if value.isdecimal() and (len(value) < 16 and (value[0] != "0" or value == "0")):
        return value
    try:
        number = float(value)
    except ValueError:
        return value
    if abs(number) < 1e15 and number == int(number):
        return str(int(number))
    return repr(number).replace(".", decimal)


class _Reader:
    """Takes the pieces of the XML in their order; holds one row at a time."""

    def __init__(self, book: Book, decimal: str) -> None:
        self.sheet = SheetRows()
        self._book, self._decimal = book, decimal
        self._row, self._hidden, self._column = 0, False, 0
        self._cells: list[str] = []
        self._kind, self._style, self._formula = "", 0, False
        self._value, self._pieces = "", 0
        self._listens = self._inside = False  # to a value; within phonetic text
        self._size = 0
        self._digits = ""  # of the row, as references of its cells end
        self._places: dict[str, int] = {}  # columns by their letters
        self._written: dict[str, str] = {}  # texts of cells' own, as they are written
        self._seldom: dict[str, Callable[[dict[str, str]], None]] = {
            "row": self._begin_row,
            "f": self._begin_formula,
            "rPh": self._begin_spoken,
            "mergeCell": self._merge,
            "col": self._columns,
        }

    # begin, end and text are called five times a cell, a million times over: no call that can be
    # spared is made in them, and what comes most often is asked first
    def begin(self, tag: str, given: dict[str, str]) -> None:
        if ":" in tag:
            tag = local(tag)
        if tag == "v" or tag == "t":
            self._listens = not self._inside
        elif tag == "c":
            reference = given.get("r")
            column = self._column + 1
            if reference:
                name = reference.removesuffix(self._digits)
                column = self._places.get(name) or self._placed(reference)
            if not self._column < column <= LAST_COLUMN:
                raise Broken(Text("cells out of order"))
            self._column = column
            self._kind, style = given.get("t", "n"), given.get("s")
            self._style = int(style) if style else 0
            self._formula, self._value = False, ""
        elif act := self._seldom.get(tag):
            act(given)

    def end(self, tag: str) -> None:
        if ":" in tag:
            tag = local(tag)
        if tag == "v" or tag == "t":
            self._listens = False
        elif tag == "c":
            if self._value or self._formula:
                self._end_cell()
        elif tag == "row":
            self._end_row()
        elif tag == "rPh":
            self._inside = False

    def text(self, piece: str) -> None:
        if self._listens:
            if not self._value:
                self._value, self._pieces = piece, 1
                return
            self._value += piece
            self._pieces += 1
            if self._pieces > MOST_PIECES:
                raise TooLarge

    def _placed(self, reference: str) -> int:
        """The column of a cell whose letters come for the first time. Raises: Broken."""
        column = place(reference)[1]
        name = reference.removesuffix(self._digits)
        if name.isalpha():  # else it names another row than the one it stands in
            self._places[name] = column
        return column

    def _begin_row(self, given: dict[str, str]) -> None:
        before, number = self._row, given.get("r")
        self._row = int(number) if number else before + 1
        if not before < self._row <= LAST_ROW:
            raise Broken(Text("rows out of order"))
        self._hidden = given.get("hidden") in ("1", "true")
        self._column, self._cells, self._digits = 0, [], str(self._row)

    def _begin_formula(self, _: dict[str, str]) -> None:
        self._formula = True

    def _begin_spoken(self, _: dict[str, str]) -> None:
        self._inside = True

    def _columns(self, given: dict[str, str]) -> None:
        if given.get("hidden") in ("1", "true"):
            first, last = int(given.get("min", "1")), int(given.get("max", "1"))
            self.sheet.hidden_columns += range(first, min(last, LAST_COLUMN) + 1)[:100]

    def _merge(self, given: dict[str, str]) -> None:
        first, _, last = given.get("ref", "").partition(":")
        if len(self.sheet.merged) >= MOST_MERGED:
            raise TooLarge
        self.sheet.merged.append(Merged(*place(first), *place(last or first)))

    def _end_cell(self) -> None:
        value, kind = self._value, self._kind
        if self._formula:
            self._note_formula(kept=bool(value) or kind == "str")
        if not value:
            return
        if kind == "s":
            value = self._shared(value)
        elif kind == "n":
            if self._style in self._book.dates:
                value = date_of(float(value), from_1904=self._book.from_1904)
            else:
                value = number_text(value, self._decimal)
        elif kind == "b":
            value = "TRUE" if value == "1" else "FALSE"
        elif kind in ("str", "inlineStr"):
            value = self._written.get(value) or self._text(value)
        if value:
            if self._column > MOST_COLUMNS:
                raise TooWide(self._row)
            if lacking := self._column - 1 - len(self._cells):
                self._cells += [""] * lacking
            self._cells.append(value)

    def _text(self, raw: str) -> str:
        """A text that comes for the first time, or again after many others."""
        text = written(raw)
        if len(self._written) < KEPT:
            self._written[raw] = text
        if len(self.sheet.marked) < MARKED and may_be_number(text):
            self.sheet.marked[text] = None
        return text

    def _shared(self, value: str) -> str:
        try:
            return self._book.texts[int(value)]
        except IndexError as error:
            raise Broken(Text("texts")) from error

    def _note_formula(self, *, kept: bool) -> None:
        self.sheet.formulas += 1
        if not kept and len(self.sheet.valueless) < LISTED:
            self.sheet.valueless.append(f"{letters(self._column)}{self._row}")

    def _end_row(self) -> None:
        sheet = self.sheet
        if not self._cells:
            return
        sheet.rows += [""] * (self._row - 1 - len(sheet.rows))
        line = BETWEEN.join(self._cells)
        sheet.rows.append(line)
        sheet.width = max(sheet.width, len(self._cells))
        self._size += len(line) + 1
        if max(self._size, self._row * sheet.width) > MOST_UNPACKED:
            raise TooLarge
        if self._hidden:
            sheet.hidden.append(self._row)
