"""Read a mapped draft, run every check, and keep the report with the edition that stood then, and
what an edition made of the draft would change."""

from dataclasses import replace

from server.actions.commit_upload import Sound
from server.actions.drafts import handed
from server.actions.preview_upload import keep, worked_out
from server.actions.standing import standing
from server.intake.checks import basis
from server.intake.parsing import READER, Parsed, parse
from server.intake.report import Report
from server.intake.standing import Standing
from server.jobs.executor import Tell, untold
from server.results.preview import Preview
from server.store import editions, uploads
from server.store.connect import Session, transaction
from server.store.records import ALL_OF_IT, Basis, Upload

# what it is at, texts of the catalogue
OPENING, COMPARING, WRITING = (
    "opening the files",
    "comparing with what stands",
    "writing the report",
)


def check_upload(session: Session, *, upload_id: int, tell: Tell = untold) -> Report:
    """All problems at once, and what the upload would become. Nothing becomes an edition here.
    How far it is, it tells by its stages, of which each file has one.

    Raises: Missing; Refused where a file has no mapping yet, the upload is an edition already, or
    what was said of it was changed meanwhile.
    """
    upload = uploads.find(session, upload_id)
    newest = editions.newest_standing(session, upload.collection)
    base = newest.number if newest else 0
    known = standing(session, upload.collection, base)
    steps = len(upload.files) + 4
    tell(0, steps, OPENING)
    files = handed(session, upload)
    parsed = parse(files, known, reached=lambda step, stage: tell(1 + step, steps, stage))
    if upload.basis is not None:
        parsed = with_basis(parsed, upload.basis, known)
    report = Report.of(parsed)
    tell(steps - 2, steps, COMPARING)
    foreseen = _foreseen(session, upload, base, parsed, report)
    tell(steps - 1, steps, WRITING)
    with transaction(session):
        uploads.require_read_so(session, upload)
        uploads.set_report(
            session,
            upload_id,
            report=report.to_json(),
            reader=READER,
            base=base,
        )
        if foreseen is not None:
            keep(session, upload_id, foreseen)
    return report


def _foreseen(
    session: Session, upload: Upload, base: int, parsed: Parsed, report: Report
) -> Preview | None:
    """What all of it would change; None where it cannot become an edition as it stands."""
    if upload.basis is None or report.errors:
        return None
    sound = Sound(upload, upload.basis, base, warnings=len(report.warnings), rows=report.rows)
    return worked_out(session, sound, parsed, ALL_OF_IT)


def with_basis(parsed: Parsed, own: Basis, known: Standing) -> Parsed:
    """With what is found in the basis, and the years that get a new population."""
    bases = basis.Bases(own, frozenset(parsed.cells), parsed.breaks, known)
    problems = (*parsed.problems, *basis.problems_of(bases))
    return replace(parsed, problems=problems, rebased=basis.rebased(bases))
