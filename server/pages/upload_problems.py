"""What the checks of an upload found, and how it becomes an edition."""

from dataclasses import dataclass
from typing import ClassVar

from server.exports.table import Column, Row, Table
from server.intake.problems import Problem
from server.intake.report import Report
from server.pages import upload_causes, upload_unstated
from server.pages.contents_tables import Listing
from server.pages.page import Frame, Notice, Page
from server.pages.upload import locator
from server.pages.upload_effect import Effect, effect
from server.results.preview import Preview
from server.sentences import methods, reading, small_tables
from server.sentences import uploads as say
from server.sentences.numbers import as_needed
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _
from server.store import collections, editions, uploads
from server.store.connect import Session
from server.store.records import ALL_OF_IT, Taking, Upload


@dataclass(frozen=True, slots=True)
class Making:
    """What the buttons of the page do."""

    roles: reading.Options  # files that can be replaced
    role: str  # the first with an error
    button: str
    possible: bool
    why: str
    note_needed: bool
    effect: Effect | None  # None: it cannot be told, since the upload is not sound


@dataclass(frozen=True, slots=True, kw_only=True)
class UploadProblemsPage(Page):
    """Can this upload become an edition?"""

    template: ClassVar[str] = "upload_problems/page.html"
    place: str
    errors: Listing
    warnings: Listing
    counted: str  # how rows are counted
    unstated: Listing  # counts that did not state their sex, age or area: before and after
    shared_out: str
    by_cause: Listing  # deaths under each cause
    placed: str
    holds: tuple[tuple[str, str], ...]  # empty where nothing could be made out
    making: Making | None  # None: it is an edition already


def build(
    session: Session, upload_id: int, taking: Taking = ALL_OF_IT, shown: Preview | None = None
) -> UploadProblemsPage:
    """`upload_id` must have been checked; `shown` is what taking this of it would change, where
    that was worked out."""
    upload = uploads.find(session, upload_id)
    report = Report.from_json(upload.report)
    collection = collections.find(session, upload.collection)
    standing = editions.newest_standing(session, collection.code)
    number = standing.number if standing else 0
    place = f"/uploads/{upload.id}"
    return UploadProblemsPage(
        frame=Frame(
            title=_("What the checks found"),
            address=f"{place}/problems",
            locator=locator(upload, collection, _steps(upload)),
            shown=_("Not an edition") if upload.edition is None else "",
            nav="upload",
            notices=_notices(upload, number),
        ),
        answer=_answer(upload, report),
        lead=() if upload.edition else (say.read_rows(report.rows, report.sound, number),),
        tables=(
            _table(report.problems),
            *upload_unstated.listing(report).tables,
            *upload_causes.listing(report).tables,
        ),
        twins={twin: f"{place}/problems.{twin}" for twin in ("csv", "xlsx", "json")},
        place=place,
        errors=_listing("errors", _("Must be put right"), report.errors),
        warnings=_listing("warnings", _("Wants a second look"), report.warnings),
        counted=_("Rows are counted as in the file, the heading being row 1."),
        unstated=upload_unstated.listing(report),
        shared_out=upload_unstated.said(report),
        by_cause=upload_causes.listing(report),
        placed=upload_causes.said(report),
        holds=_holds(report),
        making=None if upload.edition else _making(session, upload, report, taking, shown),
    )


def _steps(upload: Upload) -> Sentence:
    if upload.edition is not None:
        return phrase(_("what the checks found"))
    return phrase(
        _("what the checks found, {mapping}"),
        mapping=Piece(_("mapping"), f"/uploads/{upload.id}/reading"),
    )


def _answer(upload: Upload, report: Report) -> Sentence:
    files = [file.name for file in upload.files]
    if upload.edition is None:
        return say.answer(files, len(report.errors), len(report.warnings))
    edition = Piece(
        _("edition {number}", number=upload.edition),
        f"/c/{upload.collection}/{upload.edition}/contents",
    )
    return say.became(files, edition)


def _notices(upload: Upload, standing: int) -> tuple[Notice, ...]:
    """Another edition stands than at the time of the checks."""
    if upload.edition is not None or upload.base == standing:
        return ()
    return (Notice(_("Check again"), say.stale(upload.base or 0, standing)),)


def _listing(key: str, title: str, problems: tuple[Problem, ...]) -> Listing:
    """Problems of one severity as printed."""
    several = len({problem.file for problem in problems}) > 1
    columns = (
        *([Column("file", _("file"))] if several else []),
        Column("row", _("row")),
        Column("column", _("column")),
        Column("found", _("found")),
        Column("expected", _("expected")),
        Column("remedy", _("what to do")),
    )
    rows = tuple(Row((*([one.file] if several else []), *_cells(one))) for one in problems)
    return Listing((Table(key, title, columns, rows),) if rows else ())


def _cells(problem: Problem) -> tuple[str, ...]:
    words = problem.worded(_, as_needed)
    rows = problem.rows_worded(_, as_needed)
    return (rows or _("all"), problem.column, words.found, words.expected, words.remedy)


def _table(problems: tuple[Problem, ...]) -> Table:
    """All of them in one list, for the twins."""
    return Table(
        "problems",
        _("What the checks found"),
        (
            Column("severity", _("severity")),
            Column("file", _("file")),
            Column("row", _("row")),
            Column("column", _("column")),
            Column("found", _("found")),
            Column("expected", _("expected")),
            Column("remedy", _("what to do")),
            Column("check", _("check")),
        ),
        tuple(
            Row((methods.severity(one.severity), one.file, *_cells(one), one.key))
            for one in problems
        ),
    )


def _holds(report: Report) -> tuple[tuple[str, str], ...]:
    told = small_tables.facts(report.becoming, report.breaks, report.rebased)
    if not report.periods:
        return told
    counts = say.holds(
        areas=report.areas,
        sexes=report.sexes,
        periods=report.periods,
        measures=report.measures,
        grids=report.grids,
        provisional=report.provisional,
        persons=report.persons,
        whole_area=report.whole,
        delivered=report.delivered,
    )
    return (*counts, *told)


def _making(
    session: Session, upload: Upload, report: Report, taking: Taking, shown: Preview | None
) -> Making:
    all_ = editions.listing(session, upload.collection)
    number = all_[0].number + 1 if all_ else 1
    files = {file.name: file.role for file in upload.files}
    first = report.errors[0].file if report.errors else ""
    return Making(
        roles=tuple((role, f"{reading.role(role)}: {name}") for name, role in files.items()),
        role=files.get(first, next(iter(files.values()))),
        button=_("Make edition {number}", number=number),
        possible=not report.errors,
        why=say.why_not(len(report.errors), number),
        note_needed=bool(report.warnings),
        effect=(
            None
            if report.errors
            else effect(taking, shown, report, base=upload.base or 0, number=number)
        ),
    )
