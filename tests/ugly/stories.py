"""What each of the ugly files is, what an analyst answers about it, and what must come of it."""

import io
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from datetime import datetime

import openpyxl

from tests.ugly.make import AREAS

Answers = Mapping[str, object]  # fields of a mapping
NAMED = {"northmarsh": "north", "sonderfen": "south", "isle-of-gasholm": "isle"}
CODED = {area: area for area in AREAS}


@dataclass(frozen=True, slots=True)
class Story:
    """`files` by role; `answers` by role, `shared` of every file. Where `refused` names checks, how
    many rows each and what is expected, the files must fail with these alone, and `mended` makes of
    each what must pass."""

    told: str
    files: Mapping[str, str]
    answers: Mapping[str, Answers] = field(default_factory=dict)
    shared: Answers = field(default_factory=dict)
    asked: tuple[str, ...] = ()  # what the files do not say by themselves
    warned: tuple[str, ...] = ()  # checks that want a second look, and rightly
    areas: Mapping[str, str] = field(default_factory=CODED.copy)  # codes as read, and in the truth
    provisional: tuple[str, ...] = ()  # years
    near: float = 0.0  # how far a count may be off
    sums_alone: bool = False  # only the sums by area and year are those of the truth
    refused: tuple[tuple[str, int, str], ...] = ()
    mended: Callable[[bytes], bytes] | None = None


def _ages_as_text(content: bytes) -> bytes:
    """As the remedy says: the column formatted as text and the groups typed again."""
    book = openpyxl.load_workbook(io.BytesIO(content))
    for row in book["counts"].iter_rows(min_row=2, min_col=4, max_col=4):
        if isinstance(row[0].value, datetime):
            row[0].value = {4: "1-4", 9: "5-9"}[row[0].value.month]
            row[0].number_format = "@"
    out = io.BytesIO()
    book.save(out)
    return out.getvalue()


STORIES = {
    "01": Story(
        "A German office hands in one table with titles, foot notes, decimal commas and totals of "
        "ages, sexes and areas. The totals are checked and not counted, and Insgesamt is the "
        "whole.",
        {"counts": "01-title-rows-and-totals.csv"},
        shared={"whole_name": "Insgesamt"},
        warned=("notes_left_out",),
        areas=NAMED,
    ),
    "02": Story(
        "A workbook has a sheet of remarks, one of deaths and one of people, ages across with "
        "their total. Both sheets are read as if they were files of their own.",
        {"deaths": "02-ages-across.xlsx", "population": "02-ages-across.xlsx"},
        areas=NAMED,
    ),
    "03": Story(
        "Years stand over sexes in two rows of headings, ages in rows. Deaths and people are two "
        "files of the same form.",
        {
            "deaths": "03-two-rows-of-headings-deaths.csv",
            "population": "03-two-rows-of-headings-people.csv",
        },
        areas=NAMED,
    ),
    "04": Story(
        "One death in a hundred has no age and some have no sex. They are shared out, so that the "
        "sums by area and year are those of the truth and the ages nearly so.",
        {"counts": "04-not-stated.csv"},
        shared={"unstated": (("sex", "spread"), ("age", "spread"))},
        sums_alone=True,
    ),
    "05": Story(
        "The north is still given as two districts of old codes. The table beside it says that "
        "both became the north, which is their exact sum.",
        {"counts": "05-old-codes.csv", "areas": "05-what-became-of-them.csv"},
        areas=CODED | {"N-01": "", "N-02": ""},
    ),
    "06": Story(
        "People of 1 January, with one January more than years of deaths, in UTF-16. Two Januaries "
        "in a row have the person-years of the truth for their mean.",
        {"population": "06-january-people.txt", "deaths": "06-january-deaths.txt"},
        shared={"population_is": "january"},
    ),
    "07": Story(
        "Death rates per 100,000 with six decimals stand beside the people they are of. The deaths "
        "are worked out from them.",
        {"rates": "07-rates.csv"},
        answers={"rates": {"units": (("rate", "1/100000"),), "rate_is": "rate"}},
        asked=("units", "rate_is"),
        near=1e-4,
    ),
    "08": Story(
        "A table pasted from a spreadsheet, with narrow blanks between thousands and a dash where "
        "nobody died. The dash may as well mean that nothing is known, so what it means is asked.",
        {"counts": "08-pasted.tsv"},
        answers={"counts": {"signs": (("–", "nil"),)}},
        asked=("signs",),
        areas=NAMED,
    ),
    "09": Story(
        "Some program took the ages 1-4 and 5-9 for days of the year. The file is refused, with "
        "the group that was meant, and passes once they are typed again as text.",
        {"counts": "09-dates-for-ages.xlsx"},
        refused=(
            ("date_for_age", 24, "an age group, as it may have been typed: 1–4"),
            ("date_for_age", 24, "an age group, as it may have been typed: 5–9"),
        ),
        mended=_ages_as_text,
    ),
    "10": Story(
        "A packed file with bars between fields, old line ends, two columns called note that hold "
        "nothing, and a status. The last year is provisional.",
        {"counts": "10-packed.csv.gz"},
        provisional=("2022",),
    ),
    "11": Story(
        "Deaths by cause, with codes of ICD-10 written in five ways, sums of groups and of all "
        "causes among the rows, decimal commas, and no row where nobody died. The causes add up to "
        "the truth, and the sums are not counted.",
        {"deaths": "11-by-cause.csv", "population": "11-people.csv"},
        answers={"deaths": {"cause_list": "short"}},
        asked=("cause_list",),
        warned=("notes_left_out",),
        areas=NAMED,
    ),
}
