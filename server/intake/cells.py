"""The rows of a sheet as numbers: which area, sex, year and age each one is of."""

from collections import Counter
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TypeVar

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from engine.panel import SEXES
from server.intake.areas import code_of, is_code
from server.intake.labels import (
    AGE_NOT_STATED,
    ALL_AGES,
    NOT_STATED,
    Age,
    not_stated,
    read_age,
    read_sex,
    read_status,
    read_year,
)
from server.intake.mapping import Mapping
from server.intake.sheets import Labels, Sheet

UNREADABLE = -1
TOTAL = -2  # age of a row that is a total over the ages
UNSTATED = AGE_NOT_STATED.start  # age of a row that says that its age is not known
SEX_UNSTATED = len(SEXES)  # and likewise its sex; its area is the number after the last
AREA_UNSTATED = "?"  # no area has this code
Ints = NDArray[np.int64]
Flags = NDArray[np.bool_]
Whole = TypeVar("Whole", int, Ints)
YEARS = 10_000  # places of one area and sex lie this close together


@dataclass(frozen=True, slots=True)
class Cells:
    """One number for each row and matter; UNREADABLE where the text could not be read."""

    sheet: Sheet
    area: Ints  # into the codes of the whole upload; as many as there are: not stated
    sex: Ints  # into SEXES, or SEX_UNSTATED
    year: Ints
    start: Ints  # first age of the group, or TOTAL, or UNSTATED
    end: Ints  # last age, UNREADABLE where the label does not say
    open: Flags
    status: Ints  # 0 final, 1 provisional
    areas: int  # how many areas the upload has

    @property
    def stated(self) -> Flags:
        """Rows that say of which area and sex they are, if in a way that cannot be read."""
        return (self.area < self.areas) & (self.sex < SEX_UNSTATED)

    @property
    def placed(self) -> Flags:
        """Rows whose area, sex and year are known."""
        return (self.area >= 0) & (self.sex >= 0) & (self.year >= 0)

    @property
    def place(self) -> Ints:
        """Area, sex and year in one number, in the order in which they are sorted."""
        return place_of(self.area, self.sex, self.year)


def place_of(area: Whole, sex: Whole, year: Whole) -> Whole:
    return (area * (SEX_UNSTATED + 1) + sex) * YEARS + year


def parts_of(place: Whole) -> tuple[Whole, Whole, Whole]:
    """Area, sex and year of a place, or of each of many; areas and sexes by their numbers."""
    rest, year = divmod(place, YEARS)
    area, sex = divmod(rest, SEX_UNSTATED + 1)
    return area, sex, year


def sexes_of(persons: Whole) -> tuple[Whole, Whole]:
    """Places of women and of men beside a place of persons."""
    return persons - 2 * YEARS, persons - YEARS


def codes_of(sheet: Sheet) -> list[str]:
    """The code of each distinct text that tells the area, the one of a blank last.

    '' where the text can be no code, or where another name gives the same code; AREA_UNSTATED where
    the text, or the name beside a code, says that the area is not known.
    """
    if labels := sheet.labels.get("area"):
        nameless = _nameless(sheet, labels)
        return [
            AREA_UNSTATED if not_stated(text) or text in nameless else text if is_code(text) else ""
            for text in labels.texts
        ] + [""]
    if labels := sheet.labels.get("area_name"):
        made = [AREA_UNSTATED if not_stated(text) else code_of(text) for text in labels.texts]
        times = Counter(made)
        times[AREA_UNSTATED] = 1  # several words may say so
        return [code if times[code] == 1 else "" for code in made] + [""]
    return [only_code(sheet.mapping)]


def _nameless(sheet: Sheet, areas: Labels) -> set[str]:
    """Codes that the column of names calls unknown: 99, not stated."""
    names = sheet.labels.get("area_name")
    if names is None:
        return set()
    unknown = np.flatnonzero([not_stated(text) for text in names.texts])
    found = np.unique(areas.codes[np.isin(names.codes, unknown)])
    return {areas.texts[code] for code in found[found >= 0].tolist()}


def only_code(mapping: Mapping) -> str:
    """Code of the one area of a file without an area column; made from its name if need be."""
    code = mapping.only_area or (code_of(mapping.only_area_name) if mapping.only_area_name else "")
    return code if is_code(code) else ""


def whole_code(mapping: Mapping) -> str:
    """Code of the area of which the others are parts; '' where there is none."""
    return mapping.whole or (code_of(mapping.whole_name) if mapping.whole_name else "")


def names_of(sheet: Sheet, codes: list[str]) -> dict[str, list[str]]:
    """Names that the file gives to each code, in the order of their first rows."""
    names = sheet.labels.get("area_name")
    if names is None:
        name = sheet.mapping.only_area_name
        return {codes[0]: [name]} if name and "area" not in sheet.labels else {}
    areas = sheet.labels.get("area", names)
    names_before = len(names.texts) + 1
    pairs = pd.unique((areas.codes.astype(np.int64) + 1) * names_before + names.codes + 1)
    found: dict[str, list[str]] = {}
    for area, name in zip(*divmod(pairs, names_before), strict=True):
        code = codes[area - 1]
        if code not in ("", AREA_UNSTATED) and name:
            found.setdefault(code, []).append(names.texts[name - 1])
    return found


def cells(sheet: Sheet, codes: Sequence[str]) -> Cells:
    """Read the labels of a sheet; `codes` are the area codes of the whole upload, in order."""
    mapping, labels = sheet.mapping, sheet.labels
    known = {code: place for place, code in enumerate((*codes, AREA_UNSTATED))}
    ages = _ages(labels.get("age"))
    sexes = {code: place for place, code in enumerate((*SEXES, NOT_STATED))}

    def sex(text: str) -> int:
        found = read_sex(text, mapping.sex_codes)
        return sexes.get(found or "", UNREADABLE)

    def year(text: str) -> int:
        return read_year(text) or UNREADABLE

    def provisional(text: str) -> int:
        return int(str(read_year(text)) in mapping.provisional_years)

    def status(text: str) -> int:
        found = read_status(text)
        return UNREADABLE if found is None else int(found == "provisional")

    def rows(read: list[int], field: str) -> Ints:
        return _spread(read, labels.get(field), len(sheet))

    def read(field: str, meaning: Callable[[str], int], without: int) -> Ints:
        column = labels.get(field)
        return rows(column.read(meaning, UNREADABLE) if column else [without], field)

    return Cells(
        sheet=sheet,
        area=rows(
            [known.get(code, UNREADABLE) for code in codes_of(sheet)],
            "area" if "area" in labels else "area_name",
        ),
        sex=read("sex", sex, SEXES.index(mapping.only_sex or "p")),
        year=read("year", year, UNREADABLE),
        start=rows([TOTAL if age is ALL_AGES else age.start for age in ages], "age"),
        end=rows([UNREADABLE if age.end is None else age.end for age in ages], "age"),
        open=rows([int(age.open) for age in ages], "age").astype(bool),
        status=read("status", status, 0) | read("year", provisional, 0),
        areas=len(codes),
    )


def _ages(labels: Labels | None) -> list[Age]:
    """Groups of the distinct labels; without a column of ages (births) one group of all."""
    unreadable = Age(UNREADABLE)
    if labels is None:
        return [Age(0, open=True)]
    return labels.read(lambda text: read_age(text) or unreadable, unreadable)


def _spread(read: list[int], labels: Labels | None, rows: int) -> Ints:
    """Meanings of the distinct texts on all rows; without labels the one meaning on each."""
    meanings = np.array(read, np.int64)
    return meanings[labels.codes] if labels else np.full(rows, meanings[0])
