"""All editions of a collection: which there are, who made them and why, and which one stands."""

from dataclasses import dataclass
from typing import ClassVar

from server.pages import contents_tables
from server.pages.page import Frame, Page
from server.sentences import contents as say
from server.sentences.pieces import Piece, phrase
from server.sentences.text import _
from server.store import collections, editions, policies, uploads
from server.store.connect import Session


@dataclass(frozen=True, slots=True, kw_only=True)
class EditionsPage(Page):
    """Which states of this collection are there?"""

    template: ClassVar[str] = "editions/page.html"
    collection: str  # code


def build(session: Session, code: str) -> EditionsPage:
    collection = collections.find(session, code)
    all_ = editions.listing(session, code)
    erased = uploads.erasures(session, code)
    hidden = policies.newest(session, code) is not None
    standing = next((one.number for one in all_ if not one.withdrawn), None)
    return EditionsPage(
        frame=Frame(
            title=_("Editions of {collection}", collection=collection.name),
            address=f"/c/{code}/editions",
            locator=phrase(
                _("{collections}: editions of {collection}"),
                collections=Piece(_("Collections"), "/collections"),
                collection=collection.name,
            ),
            shown=_("Data owner: {owner}", owner=collection.owner),
            nav="collections",
        ),
        answer=say.editions(collection.name, len(all_), standing),
        tables=(contents_tables.editions(collection, all_, standing, erased, hidden=hidden),),
        twins=contents_tables.editions_twins(code),
        collection=code,
    )
