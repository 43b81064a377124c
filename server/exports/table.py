"""The table a page carries: HTML and every twin are written from it, so none can disagree."""

from dataclasses import dataclass
from enum import Enum


class GapKind(Enum):
    """Four different things that are never 0."""

    WITHHELD = "withheld"
    NIL = "nil"
    NOT_AVAILABLE = "not available"
    UNDEFINED = "undefined"


@dataclass(frozen=True, slots=True)
class Gap:
    """A cell without a number, and why."""

    kind: GapKind
    reason: str = ""


Cell = str | int | float | Gap


@dataclass(frozen=True, slots=True)
class Column:
    """A named column with its unit. `decimals` is for print; twins carry the number itself."""

    key: str  # in CSV headings and JSON: lower case, underscores
    label: str  # as printed, through the catalogue
    unit: str = ""
    decimals: int | None = None  # None: text
    signed: bool = False  # a difference: print the plus sign
    under: str = ""  # low and high limits: key of the column under whose number they are printed
    span: str = ""  # printed heading over neighbouring columns that share it
    counted: bool = False  # numbers as they were handed in, not worked out from others


@dataclass(frozen=True, slots=True)
class Row:
    """One row; `provisional` marks the numbers in it; `href` links its first cell."""

    cells: tuple[Cell, ...]
    provisional: bool = False
    second: str = ""  # second line under the first cell (a unit, a remark)
    href: str = ""
    shown: str = ""  # printed in place of the first cell: the name behind a code
    decimals: int | None = None  # where every row is in a unit of its own: instead of the column's
    revised: bool = False  # its counts are not those of the edition before
    estimated: bool = False  # its numbers rest on estimates; not those of `counted` columns
    marks: tuple[str, ...] = ()  # status of each cell, where it is not that of the row


@dataclass(frozen=True, slots=True)
class Table:
    key: str  # in addresses: `table=` of a CSV twin, the sheet's name
    title: str
    columns: tuple[Column, ...]
    rows: tuple[Row, ...]
    note: str = ""
    total: Row | None = None  # a sum, set apart

    def column(self, key: str) -> int:
        """Index of a column; KeyError lists the keys."""
        for index, column in enumerate(self.columns):
            if column.key == key:
                return index
        raise KeyError(f"{key!r}: table {self.key} has {[column.key for column in self.columns]}")
