"""Last year's printed table, every figure of it matched or explained. Nothing is kept."""

import math
from collections import Counter
from dataclasses import dataclass
from typing import ClassVar

from engine import indicators
from engine.settings import SETTINGS
from server.exports.table import Cell, Column, Gap, GapKind, Row, Table
from server.pages import choices
from server.pages.choices import Grouped
from server.pages.page import Frame, Page
from server.pages.reproduce_rows import Cell as FileCell
from server.pages.reproduce_rows import Source, Stated, Unknown, cells, source, wanted
from server.results.account import AccountQuestion
from server.results.printed_tables import NotLookedUp, number, read
from server.results.questions import address
from server.results.reproducing import Found, reproduced
from server.sentences import account as account_say
from server.sentences import names
from server.sentences import reproduce as say
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _
from server.store import collections, editions
from server.store.connect import Session

Options = tuple[tuple[str, str], ...]
FINEST = 3  # decimals of what was printed that are told in full
MOST_DIGITS = 10  # signs of a number that is shown as it stands
LARGE = 1e9  # from here on numbers are shown as they stand
MOST_CELLS = 200  # other numbers that are listed where they differ


@dataclass(frozen=True, slots=True)
class Asked:
    """What stands beside the file; empty where the file says it itself."""

    collection: str = ""
    edition: str = ""
    settings: str = ""
    of: str = ""
    address: str = ""
    figures: str = "released"


@dataclass(frozen=True, slots=True, kw_only=True)
class ReproducePage(Page):
    """What can be looked up?"""

    template: ClassVar[str] = "reproduce/page.html"
    collections: Options
    settings: Options
    indicators: Grouped
    limits: Sentence


@dataclass(frozen=True, slots=True, kw_only=True)
class ReproducedPage(Page):
    """Is what was printed still what the almanac says?"""

    template: ClassVar[str] = "reproduced/page.html"
    figures: bool
    unknown: bool
    others: bool
    computed: tuple[Sentence, ...]


def form(session: Session) -> ReproducePage:
    known = collections.all_collections(session)
    return ReproducePage(
        frame=Frame(
            title=_("Look up a printed table"),
            address="/reproduce",
            locator=phrase(_("A printed table, looked up")),
            nav="collections",
        ),
        answer=phrase(
            _("Is what was printed still what the almanac says? Hand the table in and see.")
        ),
        collections=(("", _("as the file says")), *((one.code, one.name) for one in known)),
        settings=(
            ("", _("as the file says")),
            *((one.key, _(one.label)) for one in SETTINGS.values()),
        ),
        indicators=(
            (_("As the file says"), (("", _("as the file says")),)),
            *choices.indicators("e0"),
        ),
        limits=phrase(
            _(
                "A file saved from a page here (CSV, XLSX or JSON) says itself what it is; of a CSV"
                " file give the address it was saved from. Another table needs the columns area,"
                " sex, year, indicator and value. The file is read and forgotten: nothing is kept."
            )
        ),
    )


def build(
    session: Session, name: str, content: bytes, asked: Asked, *, most: int | None = None
) -> ReproducedPage:
    """NotLookedUp where no table is found, or its collection, edition or settings are not known;
    TooLarge where it takes more than `most` looks."""
    file = read(content, name)
    of = source(session, asked.address or file.address)
    collection, stated = _stated(session, asked, of, file.said)
    figures, unknown = wanted(session, file, collection, stated, of)
    found = reproduced(session, collection, figures, asked.figures, most=most)
    beside = cells(file, of, figures) if of else []
    counts = Counter(one.kind for one in found) + Counter({"unknown": len(unknown)})
    unlike = [one for one in beside if not one.alike]
    said = say.others(len(beside) - len(unlike), len(beside))
    tables = (
        _figures(session, collection, found),
        _unknown(unknown),
        _cells(unlike[:MOST_CELLS]),
    )
    return ReproducedPage(
        frame=_frame(session, name, collection, stated),
        answer=say.answer(name, counts),
        lead=(said,) if said else (),
        tables=tuple(table for table in tables if table.rows),
        figures=bool(found),
        unknown=bool(unknown),
        others=bool(unlike),
        computed=_computed(),
    )


def _frame(session: Session, name: str, collection: str, stated: Stated) -> Frame:
    return Frame(
        title=_("A printed table, looked up"),
        address="/reproduce",
        locator=phrase(
            _("{name} in {collection}"),
            name=name,
            collection=Piece(collections.find(session, collection).name, f"/c/{collection}"),
        ),
        nav="collections",
        colophon=(
            (_("Edition"), str(stated.edition)),
            (_("Settings"), stated.settings),
        ),
    )


def _stated(
    session: Session, asked: Asked, of: Source | None, said: dict[str, str]
) -> tuple[str, Stated]:
    """Collection, edition, settings and indicator: as asked, else as the file or its address says,
    else those that stand."""
    known = [one.code for one in collections.all_collections(session)]
    code = (
        asked.collection or (of.heading.collection.code if of else "") or said.get("collection", "")
    )
    code = code or (known[0] if len(known) == 1 else "")
    if code not in known:
        raise NotLookedUp(
            _(
                "The file does not say of which collection it is. Choose one: {known}.",
                known=names.listed(known),
            )
        )
    text = (
        asked.edition or (str(of.heading.edition.number) if of else "") or said.get("edition", "")
    )
    standing = editions.newest_standing(session, code)
    edition = int(text) if text.isascii() and text.isdecimal() and len(text) < 10 else 0
    edition = edition or (standing.number if standing else 0)
    if editions.find(session, code, edition) is None:
        raise NotLookedUp(
            _(
                "{collection} has no edition {number}. Leave it out, or name one that there is.",
                collection=code,
                number=text or edition,
            )
        )
    settings = asked.settings or (of.question.settings if of else "") or said.get("settings", "")
    settings = settings.partition(":")[0].strip()
    own = getattr(of.question, "of", "") if of else ""
    indicator = asked.of or (own if isinstance(own, str) else "")
    return code, Stated(edition, settings if settings in SETTINGS else "almanac-1", indicator)


def _figures(session: Session, collection: str, found: tuple[Found, ...]) -> Table:
    """One row a printed figure."""
    standing = editions.newest_standing(session, collection)
    newest = standing.number if standing else 0
    return Table(
        "figures",
        _("Printed figures"),
        (
            Column("row", _("row")),
            Column("area", _("area")),
            Column("sex", _("sex")),
            Column("year", _("year")),
            Column("indicator", _("indicator")),
            Column("printed", _("printed")),
            Column("then", _("then"), decimals=2),
            Column("now", _("now"), decimals=2),
            Column("verdict", _("verdict")),
            Column("why", _("why")),
        ),
        tuple(_row(one, collection, newest) for one in found),
        _(
            "Matched: equal once rounded as it was printed. Then: what its edition and settings"
            " give today; now: what the edition that stands gives. With few decimals, to be equal"
            " elsewhere may be chance."
        ),
    )


def _row(one: Found, collection: str, newest: int) -> Row:
    of, printed = indicators.find(one.wanted.of), number(one.wanted.text)
    at = one.wanted.at
    decimals = max(of.unit.decimals, min(printed.decimals, FINEST) if printed else 0) + 1
    question = AccountQuestion(
        at,
        one.wanted.edition,
        of.key,
        "released",
        one.wanted.settings,
        one.wanted.settings,
    )
    return Row(
        (
            one.wanted.row,
            at.area,
            names.sex(at.sex),
            at.period,
            of.key,
            _short(one.wanted.text, decimals) or _("nothing"),
            _number(one.stated),
            _number(one.newest),
            say.kind(one.kind),
            _why(one, newest, decimals),
        ),
        href=address(collection, newest, question) if one.kind in ("revised", "astray") else "",
        decimals=decimals,
    )


def _short(text: str, decimals: int) -> str:
    """A printed number of many digits with those that are told, and that there are more."""
    found = number(text)
    if found is None or found.decimals <= decimals + 2 or abs(found.value) >= LARGE:
        return text
    return f"{found.value:.{decimals}f}…"


def told_apart(printed: str, today: str) -> tuple[str, str]:
    """Two numbers of many digits, with as many as tell them apart and one more."""
    both = number(printed), number(today)
    if max(len(printed), len(today)) <= MOST_DIGITS or both[0] is None or both[1] is None:
        return printed, today
    for digits in range(5, 17):
        first, second = (f"{one.value:.{digits}g}" for one in both if one)
        if first != second:
            break
    return tuple(f"{one.value:.{digits + 1}g}…" for one in both if one)  # type: ignore[return-value]


def _number(value: float) -> Cell:
    return value if math.isfinite(value) else Gap(GapKind.NOT_AVAILABLE)


def _why(one: Found, newest: int, decimals: int) -> str:
    parts: list[str] = []
    if one.account is not None and one.account.shares is not None:
        scale = one.account.indicator.unit.scale
        moved = dict(one.account.shares.amounts) | {"engine": one.account.astray}
        shown = [part for part in moved if abs(scale * moved[part]) >= 0.5 * 10**-decimals]
        in_order = sorted(shown, key=lambda part: -abs(moved[part]))
        parts = [account_say.share(part, scale * moved[part], decimals) for part in in_order]
    return say.why(
        one.kind,
        edition=one.edition or one.wanted.edition,
        newest=newest,
        settings=one.settings or one.wanted.settings,
        parts=parts,
    )


def _unknown(rows: list[Unknown]) -> Table:
    """Rows that name what is not known here."""
    return Table(
        "unknown",
        _("Rows that are not known"),
        (
            Column("row", _("row")),
            Column("area", _("area")),
            Column("sex", _("sex")),
            Column("year", _("year")),
            Column("indicator", _("indicator")),
            Column("printed", _("printed")),
            Column("why", _("why")),
        ),
        tuple(Row((one.row, *one.texts, one.why)) for one in rows),
    )


def _cells(unlike: list[FileCell]) -> Table:
    """Other numbers of the file that its address gives otherwise today."""
    return Table(
        "others",
        _("Other numbers that differ"),
        (
            Column("table", _("table")),
            Column("row", _("row")),
            Column("column", _("column")),
            Column("printed", _("printed")),
            Column("today", _("today")),
        ),
        tuple(
            Row((one.table or _("the file"), one.row, one.column, text, today or _("none")))
            for one in unlike
            for text, today in (told_apart(one.text, one.today),)
        ),
    )


def _computed() -> tuple[Sentence, ...]:
    return (
        phrase(
            _(
                "A figure is matched where today’s figure, rounded to the decimals that were"
                " printed, is the same. What is not is looked for in every other edition, then"
                " under every other settings."
            )
        ),
        phrase(
            _(
                "What a revision moved is parted exactly among deaths, population, the reading of"
                " the files, the make-up of areas and settings; what is left beside the printed"
                " number is put down to the engine or to rounding."
            )
        ),
    )
