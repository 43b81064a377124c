"""What a mapping meets in the file and must be told: totals, counts that do not state something,
codes of sexes that mean different things in different places."""

from collections.abc import Iterable
from dataclasses import dataclass

from server.intake.folding import folded
from server.intake.labels import (
    AGE_NOT_STATED,
    ALL_AGES,
    NOT_STATED,
    is_total,
    not_stated,
    read_age,
    read_sex,
)
from server.intake.mapping import Mapping
from server.intake.reading import Reading

MOST_SEXES = 12  # texts of a column of sexes; one with more holds something else

Said = tuple[tuple[str, tuple[str, ...]], ...]  # a field, and the texts that say it


@dataclass(frozen=True, slots=True)
class Code:
    """A text for a sex that is not known, or means different sexes in different places."""

    text: str
    likely: str = ""  # f or m, where one is
    asked: bool = True  # False: rather a slip, which the checks tell if nothing is said about it


@dataclass(frozen=True, slots=True)
class Noticed:
    """Texts as they stand in the file; of fields sex, age and area."""

    totals: Said = ()  # kept as a cross-check, never counted twice
    unstated: Said = ()
    sexes: tuple[Code, ...] = ()
    last_age: str = ""  # the last group, where none is marked as open
    whole: str = ""  # area that is called by a word for the sum of all


def notice(reading: Reading, mapping: Mapping) -> Noticed:
    """Look through all texts of the columns that say sex, age and area."""
    texts = {field: texts_of(reading, mapping, field) for field in ("sex", "age", "area")}
    codes = mapping.sex_codes
    unstated = {
        "sex": [text for text in texts["sex"] if read_sex(text, codes) == NOT_STATED],
        "age": [text for text in texts["age"] if read_age(text) == AGE_NOT_STATED],
        "area": [text for text in texts["area"] if not_stated(text)],
    }
    wholes = [text for text in texts["area"] if is_total(text)]
    totals = {
        "sex": [text for text in texts["sex"] if read_sex(text, codes) == "p"],
        "age": [text for text in texts["age"] if read_age(text) == ALL_AGES],
        "area": wholes,
    }
    if len(totals["sex"]) == len(texts["sex"]):
        totals["sex"] = []  # a file of persons alone
    return Noticed(
        totals=_said(totals),
        unstated=_said(unstated),
        sexes=_doubtful(texts["sex"]),
        last_age=_last_unmarked(texts["age"]),
        whole=wholes[0] if wholes else "",
    )


def texts_of(reading: Reading, mapping: Mapping, field: str) -> tuple[str, ...]:
    """All texts that say a field, in a column or in headings, in the order found."""
    form = mapping.form
    if field in form.across:
        place = form.across.index(field) + 1
        return tuple(dict.fromkeys(row[place] for row in form.across_columns))
    column = mapping.column(field) or (mapping.area_name if field == "area" else "")
    if column not in reading.columns:
        return ()
    return tuple(text for text in reading.distinct(column) if text)


def _said(found: dict[str, list[str]]) -> Said:
    return tuple((field, tuple(texts)) for field, texts in found.items() if texts)


def _doubtful(texts: Iterable[str]) -> tuple[Code, ...]:
    """Codes of sexes that are not known, and M beside H or V, which is then not sure to be men.

    H is men in French, Spanish and Portuguese; M beside it, in the latter two, is women. For
    figures and for M beside V nothing is likely: Dutch and Spanish tables disagree.
    """
    found = {folded(text): text for text in texts}
    beside = {"h", "v"} & set(found)
    doubtful = {
        said: text
        for said, text in found.items()
        if read_sex(text) is None or (beside and said == "m")
    }
    if len(doubtful) > MOST_SEXES:
        return ()
    meant = {"h": "m", "m": "f"} if beside == {"h"} else {}
    return tuple(
        Code(text, meant.get(said, ""), asked=said in ("h", "m", "v") or said.isdecimal())
        for said, text in doubtful.items()
    )


def _last_unmarked(texts: Iterable[str]) -> str:
    """The label of the oldest group; empty where one is open, or where there are none."""
    ages = [(age, text) for text in texts if (age := read_age(text)) and age.start >= 0]
    if not ages or any(age.open for age, _ in ages):
        return ""
    return max(ages, key=lambda found: found[0].start)[1]
