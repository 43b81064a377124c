"""A file as columns of codes and numbers: a text is read once, however many rows have it."""

import io
import math
import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import TypeVar

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from engine.ages import Array
from server.intake.layout import Layout
from server.intake.mapping import COLUMNS, NUMBERS, Mapping, numbers_of

T = TypeVar("T")
_NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?|[+-]?inf(?:inity)?", re.IGNORECASE)


@dataclass(frozen=True, slots=True)
class Labels:
    """A column of text: a code for each row into its distinct texts, -1 where it is blank."""

    codes: NDArray[np.int32]
    texts: tuple[str, ...]

    def read(self, meaning: Callable[[str], T], blank: T) -> list[T]:
        """Meaning of each distinct text, the one of a blank last, so that code -1 finds it."""
        return [*(meaning(text) for text in self.texts), blank]

    def at(self, rows: NDArray[np.bool_] | NDArray[np.int64]) -> NDArray[np.object_]:
        """Texts of some rows."""
        return np.array([*self.texts, ""], object)[self.codes[rows]]


@dataclass(frozen=True, slots=True)
class Numbers:
    """A column of numbers; nan where the field is blank or no number, inf where it is infinite."""

    values: Array
    texts: Labels | None  # kept where some field is no number

    def at(self, rows: NDArray[np.bool_]) -> NDArray[np.object_]:
        """The fields of some rows as written, or nearly so."""
        if self.texts is not None:
            return self.texts.at(rows)
        return np.array([f"{value:.15g}" for value in self.values[rows]], object)


@dataclass(frozen=True, slots=True)
class Sheet:
    """The mapped columns of one file, blank lines left out."""

    role: str
    name: str
    mapping: Mapping
    row: NDArray[np.int64]  # row in the file, the heading being row 1
    labels: dict[str, Labels]  # by field of the mapping
    numbers: dict[str, Numbers]

    def __len__(self) -> int:
        return len(self.row)


def load(file: Layout, mapping: Mapping, role: str) -> Sheet:
    """Read the mapped columns of a file that passed the checks of files and of columns."""
    fields = [field for field in COLUMNS if mapping.column(field)]
    fields = [field for field in fields if field not in NUMBERS or field in numbers_of(role)]
    place = {field: file.columns.index(mapping.column(field)) for field in fields}
    texts = {place[field] for field in fields if field not in NUMBERS}
    table = _table(file, place, texts)
    kept = file.fields > 0
    whole = bool(kept.all())
    labels, numbers = {}, {}
    for field in fields:
        column = table[place[field]]
        if field in NUMBERS:
            found = _numbers(column)
            numbers[field] = found if whole else _kept_numbers(found, kept)
        else:
            coded = _labels(column)
            labels[field] = coded if whole else Labels(coded.codes[kept], coded.texts)
    return Sheet(role, file.name, mapping, np.flatnonzero(kept) + file.first, labels, numbers)


def _table(file: Layout, place: dict[str, int], texts: set[int]) -> pd.DataFrame:
    """Texts as they are written; numbers as numbers if all of them are, else as texts too.

    The reader of tables takes a column of nothing but "True" for ones, so the first row is asked;
    as categories it would take the codes "01" and "1" for the same number.
    """
    first = file.first_rows(1)[0]
    numbers = set(place.values()) - texts
    words = {column for column in numbers if _may_be_word(first, column)}
    try:
        types = dict.fromkeys(texts | words, "object")
        return _read(file, types | dict.fromkeys(numbers - words, "float64"))
    except ValueError:
        return _read(file, dict.fromkeys(texts | numbers, "object"))


def _may_be_word(first: tuple[str, ...], column: int) -> bool:
    """Of a first row so long that it was cut short, nothing is known."""
    return column >= len(first) or first[column].strip().casefold() in ("true", "false")


def _read(file: Layout, types: dict[int, str]) -> pd.DataFrame:
    table = pd.read_csv(
        io.BytesIO(file.body),
        sep=file.delimiter,
        header=None,
        names=list(range(len(file.columns))),
        usecols=sorted(types),
        dtype=types,
        index_col=False,
        keep_default_na=False,
        na_values=[""],
        skip_blank_lines=False,
        low_memory=False,
    )
    if len(table) != len(file.ends):
        raise AssertionError(f"{len(file.ends)} lines were cut but {len(table)} read")
    return table


def _labels(column: "pd.Series[object]") -> Labels:
    """Codes into the distinct texts without the blanks around them."""
    which, written = pd.factorize(column)
    distinct = sorted({text.strip() for text in written} - {""})
    code = {text: place for place, text in enumerate(distinct)}
    codes = np.array([*(code.get(text.strip(), -1) for text in written), -1], np.int32)
    return Labels(codes[which], tuple(distinct))


def _numbers(column: "pd.Series[object]") -> Numbers:
    if column.dtype == "float64":
        return Numbers(column.to_numpy(np.float64), None)
    texts = _labels(column)
    return Numbers(np.array(texts.read(_number, math.nan))[texts.codes], texts)


def _number(text: str) -> float:
    return float(text) if _NUMBER.fullmatch(text) else math.nan


def _kept_numbers(found: Numbers, kept: NDArray[np.bool_]) -> Numbers:
    texts = found.texts and Labels(found.texts.codes[kept], found.texts.texts)
    return Numbers(found.values[kept], texts)
