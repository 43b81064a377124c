"""From a printed file to the figures it names, and to the other cells of the page it came from."""

import re
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from typing import Any
from urllib.parse import parse_qsl

from engine import indicators
from engine.panel import SEXES
from engine.settings import SETTINGS
from server.exports.flat import flat
from server.intake.labels import read_sex
from server.pages import account, changes, comparison, contents, curves, population_year, trend
from server.pages.page import Page
from server.results.account import AccountQuestion
from server.results.changes import ChangesQuestion
from server.results.contents import ContentsQuestion
from server.results.holdings import Holdings, holdings
from server.results.keys import BadAddress, PopulationYear
from server.results.printed_tables import PrintedFile, PrintedRow, PrintedTable, columns_of, number
from server.results.questions import (
    ComparisonQuestion,
    CurvesQuestion,
    PopulationYearQuestion,
    TrendQuestion,
)
from server.results.reproducing import Wanted
from server.sentences import reproduce as say
from server.store.connect import Session
from server.store.heading import Heading, heading

VIEWS: dict[str, tuple[Any, Callable[[Session, Heading, Any], Page]]] = {
    ContentsQuestion.view: (ContentsQuestion, contents.build),
    PopulationYearQuestion.view: (PopulationYearQuestion, population_year.build),
    CurvesQuestion.view: (CurvesQuestion, curves.build),
    ComparisonQuestion.view: (ComparisonQuestion, comparison.build),
    TrendQuestion.view: (TrendQuestion, trend.build),
    ChangesQuestion.view: (ChangesQuestion, changes.build),
    AccountQuestion.view: (AccountQuestion, account.build),
}
_PLACE = re.compile(r"(?:https?://[^/]+)?/c/([A-Za-z0-9_.-]+)/(\d+)/([a-z-]+?)(?:\.\w+)?\?(.*)")
NAMES = {one.label.casefold(): key for key, one in indicators.INDICATORS.items()}


@dataclass(frozen=True, slots=True)
class Source:
    """The page that a file was saved from."""

    heading: Heading
    question: Any
    page: Page


@dataclass(frozen=True, slots=True)
class Stated:
    """What holds for rows that say nothing of it."""

    edition: int
    settings: str
    of: str = ""  # the indicator; empty: rows name it


@dataclass(frozen=True, slots=True)
class Unknown:
    """A row that names what is not known here."""

    row: int
    texts: tuple[str, str, str, str, str]  # area, sex, year, indicator, value
    why: str


def source(session: Session, address: str) -> Source | None:
    """None where the address is none of a page that figures stand on. Missing for its edition."""
    found = _PLACE.fullmatch(address.strip())
    if found is None or found[3] not in VIEWS:
        return None
    view, build = VIEWS[found[3]]
    try:
        items = [one for one in parse_qsl(found[4]) if one[0] != "table"]
        question = view.parse(items)
    except BadAddress:
        return None
    known = heading(session, found[1], int(found[2]))
    return Source(known, question, build(session, known, question))


def wanted(
    session: Session, file: PrintedFile, collection: str, stated: Stated, of: Source | None
) -> tuple[list[Wanted], list[Unknown]]:
    """The figures a file names, and rows that name what is not known."""
    held = holdings(session, collection, stated.edition)
    found: list[Wanted] = []
    unknown: list[Unknown] = []
    for table in file.tables:
        for one in _rows(table, held, stated, of):
            (found if isinstance(one, Wanted) else unknown).append(one)  # type: ignore[arg-type]
    return found, unknown


def _rows(
    table: PrintedTable, held: Holdings, stated: Stated, of: Source | None
) -> Iterable[Wanted | Unknown]:
    columns, asked = columns_of(table), of.question if of else None
    if {"area", "sex", "year", "value"} <= columns.keys():
        return [_plain(row, columns, held, stated) for row in table.rows]
    if isinstance(asked, TrendQuestion) and "year" in columns:
        return _by_year(table, columns["year"], stated)
    figures = isinstance(asked, PopulationYearQuestion) and "indicator" in columns
    if figures and asked is not None and "value" in columns:
        return [
            Wanted(row.number, text, asked.of, key, stated.edition, stated.settings)
            for row in table.rows
            if (text := row.texts.get("value", "")) and (key := row.texts["indicator"])
        ]
    return []


def _by_year(table: PrintedTable, year: str, stated: Stated) -> list[Wanted]:
    """Years by area and sex, as a trend prints them."""
    found = []
    for row in table.rows:
        for heading_, text in row.texts.items():
            area, _dot, sex = heading_.rpartition(".")
            if area and sex in SEXES and number(text) is not None:
                at = PopulationYear(area, sex, row.texts[year])
                found.append(
                    Wanted(row.number, text, at, stated.of, stated.edition, stated.settings)
                )
    return found


def _plain(
    row: PrintedRow, columns: dict[str, str], held: Holdings, stated: Stated
) -> Wanted | Unknown:
    """A row that says whose figure it is."""
    texts = {part: row.texts.get(heading_, "").strip() for part, heading_ in columns.items()}
    read = {
        "area": _area(texts["area"], held),
        "sex": _sex(texts["sex"]),
        "year": texts["year"] if re.fullmatch(r"\d{4}", texts["year"]) else "",
        "indicator": _indicator(texts.get("indicator", "")) or stated.of,
        "settings": texts.get("settings", "") or stated.settings,
        "edition": texts.get("edition", "") or str(stated.edition),
    }
    wrong = [part for part in ("area", "sex", "year", "indicator") if not read[part]]
    wrong += ["settings"] if read["settings"] not in SETTINGS else []
    wrong += ["edition"] if not read["edition"].isdecimal() else []
    if wrong:
        told = [texts.get(part, "") for part in ("area", "sex", "year", "indicator", "value")]
        why = say.unreadable(wrong[0], texts.get(wrong[0], ""))
        return Unknown(row.number, (told[0], told[1], told[2], told[3], told[4]), why)
    at = PopulationYear(read["area"], read["sex"], read["year"])
    return Wanted(
        row.number, texts["value"], at, read["indicator"], int(read["edition"]), read["settings"]
    )


def _area(text: str, held: Holdings) -> str:
    """By its code, or its name."""
    if any(one.code == text for one in held.areas):
        return text
    named = [one.code for one in held.areas if one.name.casefold() == text.casefold()]
    return named[0] if len(named) == 1 else ""


def _sex(text: str) -> str:
    found = text if text in SEXES else read_sex(text)
    return found if found in SEXES else ""


def _indicator(text: str) -> str:
    """By its key, or its label."""
    try:
        return indicators.find(text).key
    except ValueError:
        return NAMES.get(text.casefold(), "")


@dataclass(frozen=True, slots=True)
class Cell:
    """A number of a file beside the one its page gives today."""

    table: str
    row: int
    column: str
    text: str
    today: str  # empty: none

    @property
    def alike(self) -> bool:
        printed, given = number(self.text), number(self.today)
        return bool(printed and given and printed.is_of(given.value)) or self.text == self.today


def cells(file: PrintedFile, of: Source, taken: Sequence[Wanted]) -> list[Cell]:
    """Every number of a saved file that is no figure looked up by itself, beside today's of the
    same address; a table of the file that has no name is the page's first whose columns fit."""
    looked_up = {(one.row, one.text) for one in taken}
    found = []
    for table in file.tables:
        given = _same_table(table, of.page)
        if given is None:
            continue
        headings, rows = given
        for row, today in zip(table.rows, rows, strict=False):
            for column, value in zip(headings, today, strict=True):
                text = row.texts.get(column, "")
                if number(text) is not None and (row.number, text) not in looked_up:
                    shown = "" if value is None else str(value)
                    found.append(Cell(table.key, row.number, column, text, shown))
    return found


def _same_table(table: PrintedTable, page: Page) -> Any:
    for own in page.tables:
        if table.key in ("", own.key):
            form = flat(own)
            if set(table.headings) <= {*form.headings, "total", "remark", "provisional"}:
                return form.headings, form.rows
    return None
