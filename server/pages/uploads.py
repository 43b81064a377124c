"""What was uploaded: drafts that wait, and uploads that became editions."""

from dataclasses import dataclass
from typing import ClassVar

from server.exports.table import Column, Row, Table
from server.intake.report import Report
from server.pages.page import Frame, Page
from server.sentences import names
from server.sentences import uploads as say
from server.sentences.dates import day
from server.sentences.pieces import phrase
from server.sentences.text import _
from server.store import uploads
from server.store.connect import Session
from server.store.records import Upload


@dataclass(frozen=True, slots=True, kw_only=True)
class UploadsPage(Page):
    """What waits to become an edition?"""

    template: ClassVar[str] = "uploads/page.html"


def build(session: Session) -> UploadsPage:
    all_ = uploads.listing(session)
    drafts = [one for one in all_ if one.edition is None]
    done = [one for one in all_ if one.edition is not None]
    tables = (
        _table("drafts", _("Drafts"), drafts),
        _table("editions", _("Uploads that became editions"), done),
    )
    return UploadsPage(
        frame=Frame(
            title=_("Uploads"),
            address="/uploads",
            locator=phrase(_("What was uploaded")),
            nav="upload",
        ),
        answer=say.drafts(len(drafts)),
        tables=tuple(table for table in tables if table.rows),
    )


def _table(key: str, title: str, all_: list[Upload]) -> Table:
    return Table(
        key,
        title,
        (
            Column("upload", _("upload")),
            Column("collection", _("collection")),
            Column("files", _("files")),
            Column("received", _("received")),
            Column("by", _("by")),
            Column("state", _("where it stands")),
        ),
        tuple(_row(one) for one in all_),
    )


def _row(upload: Upload) -> Row:
    files = names.listed([file.name for file in upload.files])
    return Row(
        (upload.id, upload.collection, files, day(upload.received), upload.by, state(upload)),
        href=f"/uploads/{upload.id}",
    )


def state(upload: Upload) -> str:
    """Where an upload stands, in a few words."""
    report = Report.from_json(upload.report) if upload.report else None
    return say.state(
        edition=upload.edition,
        checked=report is not None,
        errors=len(report.errors) if report else 0,
        warnings=len(report.warnings) if report else 0,
    )
