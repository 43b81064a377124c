"""Read a mapped draft, run every check, and keep the report with the edition that stood then."""

from dataclasses import replace

from server.actions.standing import standing
from server.intake.checks import basis
from server.intake.mapping import Mapping
from server.intake.parsing import READER, Handed, Parsed, parse
from server.intake.report import Report
from server.intake.standing import Standing
from server.jobs.executor import Tell, untold
from server.store import editions, uploads
from server.store.connect import Session, transaction
from server.store.errors import Refused
from server.store.records import Basis, Upload

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


def handed(session: Session, upload: Upload) -> list[Handed]:
    """The files of an upload as they were handed in, with their mappings. Raises: Refused."""
    _require_mapped(upload)
    return [
        Handed(
            file.role,
            file.name,
            uploads.file_bytes(session, upload.id, file.role),
            Mapping.from_json(file.mapping),
        )
        for file in upload.files
    ]


def require_checkable(upload: Upload) -> None:
    """Raises: Refused where it is an edition already, or a file has no mapping yet."""
    require_draft(upload)
    _require_mapped(upload)


def require_draft(upload: Upload) -> None:
    """Raises: Refused where it is an edition already."""
    if upload.edition is not None:
        raise Refused(
            "Upload {upload} is edition {edition} already.",
            upload=upload.id,
            edition=upload.edition,
        )


def _require_mapped(upload: Upload) -> None:
    for file in upload.files:
        if not file.mapping:
            raise Refused(
                "The columns of {file} are not mapped yet. Say which column is which, then check "
                "the upload.",
                file=file.name,
            )
