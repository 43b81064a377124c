"""All collections: what the newest standing edition of each says, in a sentence."""

from dataclasses import dataclass
from typing import ClassVar

from server.exports.table import Column, Gap, GapKind, Row, Table
from server.pages.contents import lead
from server.pages.page import Frame, Page
from server.results.contents import Contents, ContentsQuestion, contents
from server.sentences import collections as say
from server.sentences import contents as contents_say
from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _
from server.store import collections
from server.store.connect import Session
from server.store.editions import listing, newest_standing
from server.store.heading import Heading
from server.store.records import Collection


@dataclass(frozen=True, slots=True)
class Entry:
    """One collection in the list."""

    name: str
    href: str  # empty where nothing can be read
    said: tuple[Sentence, ...]
    facts: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class CollectionsPage(Page):
    """What can be read here?"""

    template: ClassVar[str] = "collections/page.html"
    entries: tuple[Entry, ...]


def build(session: Session) -> CollectionsPage:
    known = collections.all_collections(session)
    found = {one.code: _standing(session, one) for one in known}
    return CollectionsPage(
        frame=Frame(
            title=_("Collections"),
            address="/collections",
            locator=phrase(_("Collections")),
            nav="collections",
        ),
        answer=say.answer(len(known), sum(one is not None for one in found.values())),
        tables=(_table(known, found),),
        twins={twin: f"/collections.{twin}" for twin in ("csv", "xlsx", "json")},
        entries=tuple(_entry(session, one, found[one.code]) for one in known),
    )


def _standing(session: Session, collection: Collection) -> Contents | None:
    """What the newest standing edition holds."""
    edition = newest_standing(session, collection.code)
    if edition is None:
        return None
    return contents(session, Heading(collection, edition, edition.number), ContentsQuestion())


def _entry(session: Session, collection: Collection, found: Contents | None) -> Entry:
    owner = (_("Data owner"), collection.owner)
    if found is None:
        made = len(listing(session, collection.code))
        return Entry(collection.name, "", (say.nothing_stands(collection.code, made),), (owner,))
    edition, held = found.heading.edition, found.holdings
    span = contents_say.holds(held.periods, len(held.areas))
    return Entry(
        name=collection.name,
        href=f"/c/{collection.code}",
        said=lead(found),
        facts=(
            (_("Holds"), span),
            (_("Edition"), say.edition(edition.number, edition.made, edition.note)),
            owner,
        ),
    )


def _table(known: tuple[Collection, ...], found: dict[str, Contents | None]) -> Table:
    """The list as numbers and names, for the twins."""
    return Table(
        "collections",
        _("Collections"),
        (
            Column("code", _("code")),
            Column("name", _("name")),
            Column("owner", _("data owner")),
            Column("edition", _("edition that stands"), decimals=0),
            Column("first", _("first year")),
            Column("last", _("last year")),
            Column("areas", _("areas"), decimals=0),
        ),
        tuple(_line(one, found[one.code]) for one in known),
    )


def _line(collection: Collection, found: Contents | None) -> Row:
    names = (collection.code, collection.name, collection.owner)
    none = Gap(GapKind.NOT_AVAILABLE, _("No edition stands."))
    if found is None or not found.holdings.periods:
        return Row((*names, none, none, none, none))
    periods = found.holdings.periods
    number = found.heading.edition.number
    return Row((*names, number, periods[0], periods[-1], len(found.holdings.areas)))
