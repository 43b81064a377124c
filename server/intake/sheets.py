"""A file as columns of codes and numbers: a text is read once, however many rows have it."""

import io
import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import TypeVar

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from engine.ages import Array
from server.intake.forms.across import Spread, spread
from server.intake.forms.addresses import addresses
from server.intake.forms.numbers import reader
from server.intake.forms.units import multiplier_of
from server.intake.layout import Layout
from server.intake.mapping import COLUMNS, NUMBERS, OF_CAUSES, Mapping, numbers_of

T = TypeVar("T")


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

    values: Array  # in their unit: what stands in the file, times `unit`
    texts: Labels | None  # kept where some field is no number
    unit: float = 1.0

    def at(self, rows: NDArray[np.bool_]) -> NDArray[np.object_]:
        """The fields of some rows as written, or nearly so."""
        if self.texts is not None:
            return self.texts.at(rows)
        return np.array([f"{value:.15g}" for value in self.values[rows] / self.unit], object)


@dataclass(frozen=True, slots=True)
class Sheet:
    """The mapped columns of one file, blank lines left out, one count of each kind a row."""

    role: str
    name: str
    mapping: Mapping
    row: NDArray[np.int64]  # row in the file; of a wide file an address of row and column
    labels: dict[str, Labels]  # by field of the mapping
    numbers: dict[str, Numbers]

    def __len__(self) -> int:
        return len(self.row)


def load(file: Layout, mapping: Mapping, role: str) -> Sheet:
    """Read the mapped columns of a file that passed the checks of files and of columns."""
    fields = [field for field in COLUMNS if mapping.column(field)]
    fields = [field for field in fields if field not in NUMBERS or field in numbers_of(role)]
    if role not in OF_CAUSES and "cause" in fields:
        fields.remove("cause")
    wide = spread(mapping.form)
    column = {field: file.columns.index(mapping.column(field)) for field in fields}
    texts = {column[field] for field in fields if field not in NUMBERS}
    counts = {file.columns.index(name) for name in wide.columns} if wide else set()
    table = _table(file, texts, {*column.values(), *counts} - texts)
    kept = file.fields > 0
    if not kept.all():
        table = table[kept]
    rows = np.flatnonzero(kept) + file.first
    labels = {field: _labels(table[column[field]]) for field in fields if field not in NUMBERS}
    numbers = {
        field: _numbers(table[column[field]], mapping) for field in fields if field in NUMBERS
    }
    sheet = Sheet(role, file.name, mapping, rows, labels, numbers)
    if wide:
        counted = {
            name: _numbers(table[file.columns.index(name)], mapping) for name in wide.columns
        }
        sheet = _long(sheet, wide, counted)
    scaled = {field: _scaled(found, mapping, field) for field, found in sheet.numbers.items()}
    return replace(sheet, numbers=scaled)


def _long(sheet: Sheet, wide: Spread, counted: dict[str, Numbers]) -> Sheet:
    """Each row once for each group of columns, in the order of the file. A count that stands in
    no column of its own is called by its kind."""
    rows, groups = len(sheet), len(wide.groups)
    labels = {
        field: Labels(np.repeat(found.codes, groups), found.texts)
        for field, found in sheet.labels.items()
    }
    for field in wide.fields:
        coded = _coded(np.arange(groups), wide.texts(field))
        labels[field] = Labels(np.tile(coded.codes, rows), coded.texts)
    numbers = {
        number: _side_by_side([counted.get(name) for name in wide.headings(number)], rows)
        for number in wide.numbers
    }
    called = {number: number for number in wide.numbers}
    return replace(
        sheet,
        mapping=replace(sheet.mapping, **called),  # type: ignore[arg-type]
        row=addresses(sheet.row, groups),
        labels=labels,
        numbers=numbers,
    )


def _side_by_side(columns: Sequence[Numbers | None], rows: int) -> Numbers:
    """Columns of one kind of count, as one column that goes along the rows."""
    gap = np.full(rows, np.nan)
    values = np.stack([gap if found is None else found.values for found in columns], axis=1)
    if all(found is None or found.texts is None for found in columns):
        return Numbers(values.ravel(), None)
    blank = Labels(np.full(rows, -1, np.int32), ())
    parts = [found.texts if found and found.texts else blank for found in columns]
    texts = tuple(sorted({text for part in parts for text in part.texts}))
    place = {text: number for number, text in enumerate(texts)}
    codes = [np.array([*map(place.get, part.texts), -1], np.int32)[part.codes] for part in parts]
    return Numbers(values.ravel(), Labels(np.stack(codes, axis=1).ravel(), texts))


def distinct(file: Layout, column: int, most: int) -> tuple[str, ...]:
    """The first different texts of a column without the blanks around them."""
    texts = _read(file, {column: "object"})[column].dropna().unique()
    return tuple(dict.fromkeys(filter(None, map(str.strip, texts))))[:most]


def no_numbers(file: Layout, columns: Sequence[int]) -> tuple[str, ...]:
    """The different texts of these columns, over the whole file, that are not plain numbers."""
    table = _read(file, dict.fromkeys(columns, "object"))
    found: dict[str, None] = {}
    for column in table:
        written = table[column].dropna().unique()
        strange = np.isnan(np.asarray(pd.to_numeric(written, errors="coerce"), float))
        found.update(dict.fromkeys(filter(None, map(str.strip, written[strange]))))
    return tuple(found)


def _table(file: Layout, texts: set[int], numbers: set[int]) -> pd.DataFrame:
    """Texts as they are written; numbers as numbers if all of them are, else as texts too.

    The reader of tables takes a column of nothing but "True" for ones, so the first row is asked;
    as categories it would take the codes "01" and "1" for the same number. It does not know marks
    of thousands, nor a comma both between fields and before decimals.
    """
    types = dict.fromkeys(texts | numbers, "object")
    first = file.first_rows(1)[0]
    form = file.form
    plain = not form.thousands and form.decimal != form.delimiter
    if plain and not any(_may_be_word(first, column) for column in numbers):
        try:
            return _read(file, types | dict.fromkeys(numbers, "float64"))
        except ValueError:
            pass
    return _read(file, types)


def _may_be_word(first: tuple[str, ...], column: int) -> bool:
    """Of a first row so long that it was cut short, nothing is known."""
    return column >= len(first) or first[column].strip().casefold() in ("true", "false")


def _read(file: Layout, types: dict[int, str]) -> pd.DataFrame:
    """Raises: ValueError where a number is none; MemoryError, which the reader of tables words as
    an error of the table."""
    try:
        table = _table_of(file, types)
    except pd.errors.ParserError as error:
        if "out of memory" in str(error):
            raise MemoryError from error
        raise
    if len(table) != len(file.ends):
        raise AssertionError(f"{len(file.ends)} lines were cut but {len(table)} read")
    return table


def _table_of(file: Layout, types: dict[int, str]) -> pd.DataFrame:
    return pd.read_csv(
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
        decimal=file.form.decimal,
    )


def _labels(column: "pd.Series[object]") -> Labels:
    """Codes into the distinct texts without the blanks around them."""
    which, written = pd.factorize(column)
    return _coded(which, written)


def _coded(which: NDArray[np.int64], written: Sequence[str]) -> Labels:
    distinct = sorted({text.strip() for text in written} - {""})
    code = {text: place for place, text in enumerate(distinct)}
    codes = np.array([*(code.get(text.strip(), -1) for text in written), -1], np.int32)
    return Labels(codes[which], tuple(distinct))


def _numbers(column: "pd.Series[object]", mapping: Mapping) -> Numbers:
    """A sign that was said to mean nil is 0."""
    if column.dtype == "float64":
        return Numbers(column.to_numpy(np.float64), None)
    texts = _labels(column)
    read = reader(mapping.form.decimal, mapping.form.thousands)
    nil = {text for text, meaning in mapping.signs if meaning == "nil"}
    values = texts.read(lambda text: 0.0 if text in nil else read(text), math.nan)
    return Numbers(np.array(values)[texts.codes], texts)


def _scaled(found: Numbers, mapping: Mapping, field: str) -> Numbers:
    unit = multiplier_of(mapping, field)
    if unit == 1:
        return found
    values = found.values * unit.numerator / unit.denominator
    return Numbers(values, found.texts, float(unit))
