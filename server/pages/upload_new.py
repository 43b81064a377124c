"""Where files are chosen, and the collection they are for."""

from dataclasses import dataclass
from typing import ClassVar

from server.pages.form_fields import Field
from server.pages.page import Frame, Page
from server.pages.small_tables import lines
from server.sentences import small_tables as say
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.reading import Options
from server.sentences.start import templates
from server.sentences.text import _
from server.store import collections
from server.store.connect import Session

ACCEPTS = ".csv,.tsv,.txt,.tab,.gz,.xlsx,text/csv,text/tab-separated-values,text/plain"


@dataclass(frozen=True, slots=True)
class TypedTable:
    """A small table that may be typed in place of a file."""

    title: str
    about: Sentence
    fields: tuple[Field, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class UploadNewPage(Page):
    """Which files, and for which collection?"""

    template: ClassVar[str] = "upload_new/page.html"
    collections: Options  # the first is a new one
    chosen: str  # code; empty: a new one
    form_of_files: Sentence
    accepts: str  # names and kinds of files that the choosers offer
    templates: Sentence
    rebase: Sentence  # a population alone
    causes: Sentence  # deaths by cause
    lists: tuple[TypedTable, ...]  # small tables that can be typed


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
                "Tables as CSV or other text, packed with gzip, or as a workbook (XLSX): one row "
                "for each year, sex and age, or ages, sexes or years side by side. Notes above "
                "and below may stay. Together at most {limit} MB."
            ),
            limit=str(limit // 1_000_000),
        ),
        accepts=ACCEPTS,
        templates=templates(),
        rebase=say.about_rebase(),
        causes=say.about_causes(),
        lists=(
            TypedTable(_("Codes of areas that changed"), say.about_areas(), lines("areas")),
            TypedTable(_("Breaks and years of shock"), say.about_breaks(), lines("breaks")),
        ),
    )
