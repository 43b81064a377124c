"""Where files are chosen, and the collection they are for."""

from dataclasses import dataclass
from typing import ClassVar

from server.pages.page import Frame, Page
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.reading import Options
from server.sentences.start import templates
from server.sentences.text import _
from server.store import collections
from server.store.connect import Session


@dataclass(frozen=True, slots=True, kw_only=True)
class UploadNewPage(Page):
    """Which files, and for which collection?"""

    template: ClassVar[str] = "upload_new/page.html"
    collections: Options  # the first is a new one
    chosen: str  # code; empty: a new one
    form_of_files: Sentence
    templates: Sentence


def build(session: Session, chosen: str, *, limit: int) -> UploadNewPage:
    """`chosen` is proposed where there is such a collection. Missing lists those there are."""
    known = collections.all_collections(session)
    if chosen:
        collections.find(session, chosen)
    return UploadNewPage(
        frame=Frame(
            title=_("Upload files"),
            address="/uploads/new",
            locator=phrase(
                _("{uploads}: new files"), uploads=Piece(_("What was uploaded"), "/uploads")
            ),
            nav="upload",
        ),
        answer=phrase(
            _("Choose files of deaths and population. Nothing is made of them until you say so.")
        ),
        collections=(
            ("", _("a new collection")),
            *((one.code, one.name) for one in known),
        ),
        chosen=chosen or (known[0].code if len(known) == 1 else ""),
        form_of_files=phrase(
            _(
                "CSV files in long form: one row for each year, sex and age, and area where there "
                "are several. Deaths and population may come in one file or in two. Together at "
                "most {limit} MB."
            ),
            limit=str(limit // 1_000_000),
        ),
        templates=templates(),
    )
