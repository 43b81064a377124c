"""Read a mapped draft, run every check, and keep the report with the edition that stood then."""

from dataclasses import replace

from server.actions.drafts import handed
from server.actions.standing import standing
from server.intake.checks import basis
from server.intake.parsing import READER, Parsed, parse
from server.intake.report import Report
from server.intake.standing import Standing
from server.jobs.executor import Tell, untold
from server.store import editions, uploads
from server.store.connect import Session, transaction
from server.store.records import Basis

# what it is at, texts of the catalogue
OPENING, WRITING = "opening the files", "writing the report"


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
    steps = len(upload.files) + 3
    tell(0, steps, OPENING)
    files = handed(session, upload)
    parsed = parse(files, known, reached=lambda step, stage: tell(1 + step, steps, stage))
    if upload.basis is not None:
        parsed = with_basis(parsed, upload.basis, known)
    report = Report.of(parsed)
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
    return report


def with_basis(parsed: Parsed, own: Basis, known: Standing) -> Parsed:
    """With what is found in the basis, and the years that get a new population."""
    bases = basis.Bases(own, frozenset(parsed.cells), parsed.breaks, known)
    problems = (*parsed.problems, *basis.problems_of(bases))
    return replace(parsed, problems=problems, rebased=basis.rebased(bases))
