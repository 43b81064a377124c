"""Checks of single fields: can it be read, and can it be true."""

import re
from collections.abc import Callable, Iterator
from dataclasses import replace

import numpy as np

from server.intake.cells import UNREADABLE, Cells, Flags
from server.intake.checks.check import Marks, RowCheck
from server.intake.forms.dates import typed_as
from server.intake.sheets import Numbers

MOST = 1e12  # a count above is a slip of the pen
_THOUSANDS = re.compile(r"[+-]?\d{1,3}(?:[,.' \u00a0\u202f]\d{3})+")
_DECIMAL_COMMA = re.compile(r"[+-]?\d+,\d+")


def _label_marks(cells: Cells, field: str, failing: Flags) -> Iterator[Marks]:
    if failing.any() and field in cells.sheet.labels:
        column = cells.sheet.mapping.column(field)
        yield Marks(column, failing, {"text": cells.sheet.labels[field].at(failing)})


def _unreadable(field: str, matter: str) -> Callable[[Cells], Iterator[Marks]]:
    return lambda cells: _label_marks(cells, field, getattr(cells, matter) == UNREADABLE)


def _unreadable_age(cells: Cells, *, dated: bool) -> Iterator[Marks]:
    """Ages that cannot be read: those that look like a date of some group, or the others."""
    labels = cells.sheet.labels.get("age")
    if labels is None:
        return
    dates = np.array([*(bool(typed_as(text)) for text in labels.texts), False])
    failing = (cells.start == UNREADABLE) & (dates[labels.codes] == dated)
    for marks in _label_marks(cells, "age", failing):
        groups = [typed_as(text) or "" for text in marks.found["text"]]
        yield replace(marks, found=marks.found | {"group": np.array(groups, object)})


def _area_code(cells: Cells) -> Iterator[Marks]:
    yield from _label_marks(cells, "area", cells.area == UNREADABLE)


def _area_name(cells: Cells, *, blank: bool) -> Iterator[Marks]:
    labels = cells.sheet.labels
    if "area" not in labels and "area_name" in labels:
        failing = (cells.area == UNREADABLE) & ((labels["area_name"].codes < 0) == blank)
        yield from _label_marks(cells, "area_name", failing)


def _number_marks(
    cells: Cells, fails: Callable[[Numbers], Flags], *, told: bool = True
) -> Iterator[Marks]:
    for field, numbers in cells.sheet.numbers.items():
        failing = fails(numbers)
        if failing.any():
            found = {"text": numbers.at(failing)} if told else {}
            yield Marks(cells.sheet.mapping.column(field), failing, found)


def _texts_that(test: Callable[[str], bool]) -> Callable[[Cells], Iterator[Marks]]:
    def fails(numbers: Numbers) -> Flags:
        if numbers.texts is None:
            return np.zeros(len(numbers.values), bool)
        failing = np.array(numbers.texts.read(test, False), bool)
        return failing[numbers.texts.codes] & np.isnan(numbers.values)

    return lambda cells: _number_marks(cells, fails)


def _thousands(text: str) -> bool:
    return _THOUSANDS.fullmatch(text) is not None


def _decimal_comma(text: str) -> bool:
    return _DECIMAL_COMMA.fullmatch(text) is not None and not _thousands(text)


def _no_number(text: str) -> bool:
    return not _thousands(text) and not _decimal_comma(text)


def _mistaken(cells: Cells) -> Iterator[Marks]:
    """Texts that are no numbers, but for those that were said to stand for one."""
    signs = {text for text, meaning in cells.sheet.mapping.signs if meaning != "mistake"}
    yield from _texts_that(lambda text: _no_number(text) and text not in signs)(cells)


def _standing_for(meaning: str) -> Callable[[Cells], Iterator[Marks]]:
    def mark(cells: Cells) -> Iterator[Marks]:
        signs = {text for text, means in cells.sheet.mapping.signs if means == meaning}
        yield from _texts_that(signs.__contains__)(cells)

    return mark


def _blank(numbers: Numbers) -> Flags:
    if numbers.texts is None:
        return np.isnan(numbers.values)
    return numbers.texts.codes < 0


# checks that leave the row's place among the ages known
OF_NUMBERS = {
    "thousands_separator",
    "decimal_comma",
    "not_a_number",
    "missing_count",
    "negative_count",
    "not_finite",
    "count_not_available",
    "count_withheld",
}

CHECKS: tuple[RowCheck[Cells], ...] = (
    RowCheck(
        key="unreadable_year",
        severity="error",
        meaning="A year is not a calendar year.",
        found="“{text}”",
        expected="a calendar year of four digits",
        remedy="Write the year as 2014.",
        mark=_unreadable("year", "year"),
    ),
    RowCheck(
        key="unknown_sex",
        severity="error",
        meaning="A word or code for the sex is not known.",
        found="“{text}”",
        expected="f, m or p (female, male, persons)",
        remedy="Give one row for each sex, or say in the mapping what the code means.",
        mark=_unreadable("sex", "sex"),
    ),
    RowCheck(
        key="unreadable_age",
        severity="error",
        meaning="An age group cannot be read.",
        found="“{text}”",
        expected="an age group such as 0, 1–4, 85+",
        remedy="Write the group by its ages; where the age is not known, write: not stated.",
        mark=lambda cells: _unreadable_age(cells, dated=False),
    ),
    RowCheck(
        key="date_for_age",
        severity="error",
        meaning="An age group was turned into a date, as spreadsheets do with 1-4 and 5-9.",
        found="the date “{text}”",
        expected="an age group, as it may have been typed: {group}",
        remedy="Format the column as text in the spreadsheet, type the group again and save.",
        mark=lambda cells: _unreadable_age(cells, dated=True),
    ),
    RowCheck(
        key="unreadable_area_code",
        severity="error",
        meaning="A code of an area has signs that no address can carry.",
        found="“{text}”",
        expected="1 to 32 letters A–Z, digits, full stops, hyphens or underscores",
        remedy="Change the code, or say in the mapping that the column holds names.",
        mark=_area_code,
    ),
    RowCheck(
        key="missing_area_name",
        severity="error",
        meaning="A row does not say which area it is of.",
        found="an empty field",
        expected="the name of an area",
        remedy="Fill in the name, or take the row out.",
        mark=lambda cells: _area_name(cells, blank=True),
    ),
    RowCheck(
        key="area_names_share_code",
        severity="error",
        meaning="Codes are made from names, and two names give the same code.",
        found="“{text}”",
        expected="names that differ in letters or digits within their first 32 signs",
        remedy="Add a column of area codes to the file.",
        mark=lambda cells: _area_name(cells, blank=False),
    ),
    RowCheck(
        key="unknown_status",
        severity="error",
        meaning="A row says neither provisional nor final.",
        found="“{text}”",
        expected="final or provisional (f or p)",
        remedy="Write one of the two, or take the column out of the mapping.",
        mark=_unreadable("status", "status"),
    ),
    RowCheck(
        key="thousands_separator",
        severity="error",
        meaning="A number has a mark between its thousands, which may be taken for a decimal mark.",
        found="“{text}”",
        expected="a number of at least 0 without a mark between thousands",
        remedy="Remove the thousands separator.",
        mark=_texts_that(_thousands),
    ),
    RowCheck(
        key="decimal_comma",
        severity="error",
        meaning="A number has a comma for its decimal mark.",
        found="“{text}”",
        expected="a number without comma",
        remedy="Write a full stop for the comma, or a whole number if counts are whole.",
        mark=_texts_that(_decimal_comma),
    ),
    RowCheck(
        key="not_a_number",
        severity="error",
        meaning="There is text where a number belongs.",
        found="“{text}”",
        expected="a number of at least 0",
        remedy="Write the count as plain digits; 0 where there was none.",
        mark=_mistaken,
    ),
    RowCheck(
        key="count_not_available",
        severity="warning",
        meaning="The file says that a count is not available, so that its area, sex and year "
        "cannot be worked out.",
        found="“{text}”, said to mean not available",
        expected="a count for every age",
        remedy="Nothing: the area, sex and year is left out, and no total is made of it. Hand the "
        "count in once it is known.",
        mark=_standing_for("not_available"),
    ),
    RowCheck(
        key="count_withheld",
        severity="warning",
        meaning="The source withholds a count, so that its area, sex and year cannot be worked "
        "out.",
        found="“{text}”, said to mean withheld",
        expected="a count for every age",
        remedy="Ask the source for wider age groups or added years; until then the area, sex and "
        "year is left out, and no total is made of it.",
        mark=_standing_for("withheld"),
    ),
    RowCheck(
        key="missing_count",
        severity="error",
        meaning="A count is missing. Missing is not the same as none.",
        found="an empty field",
        expected="a number of at least 0",
        remedy="Fill in the count; write 0 where there was none.",
        mark=lambda cells: _number_marks(cells, _blank, told=False),
    ),
    RowCheck(
        key="negative_count",
        severity="error",
        meaning="A count is below zero.",
        found="{text}",
        expected="a number of at least 0",
        remedy="Put the count right; corrections of earlier years belong to those years.",
        mark=lambda cells: _number_marks(cells, lambda numbers: numbers.values < 0),
    ),
    RowCheck(
        key="not_finite",
        severity="error",
        meaning="A count is infinite or beyond any population.",
        found="{text}",
        expected="a number below a million million",
        remedy="Put the count right.",
        mark=lambda cells: _number_marks(cells, lambda numbers: numbers.values >= MOST),
    ),
)
