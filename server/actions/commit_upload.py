"""Make an edition of a checked upload."""

import datetime as dt
from collections.abc import Sequence
from dataclasses import dataclass

from server.accounts.viewer import Right, Viewer
from server.actions import masking
from server.actions.drafts import handed, require_draft
from server.actions.laid_over import Base, made_of
from server.intake.parsing import READER, Parsed, parse
from server.intake.problems import Problem
from server.intake.report import Report
from server.jobs.executor import Tell, untold
from server.store import areas, breaks, causes, editions, schedules, uploads
from server.store.connect import Session, transaction
from server.store.errors import Refused, Stale
from server.store.records import (
    ALL_OF_IT,
    Basis,
    Change,
    Edition,
    Taking,
    Upload,
)

# what it is at, texts of the catalogue
STAGES = ("reading the files", "comparing with what stands", "writing the edition")


@dataclass(frozen=True, slots=True)
class Sound:
    """An upload that was mapped and checked and has no errors."""

    upload: Upload
    basis: Basis
    base: int
    warnings: int
    rows: int


def commit_upload(
    session: Session,
    *,
    upload_id: int,
    note: str,
    by: Viewer,
    now: dt.datetime,
    taking: Taking = ALL_OF_IT,
    tell: Tell = untold,
) -> Edition:
    """The newest standing edition with what is taken of the upload as a new edition. All or
    nothing. How far it is, it tells by its stages.

    Raises: NotAllowed; Missing; Stale where another edition stands than at the check; Refused
    where the upload is an edition already, is not mapped or checked, has errors, has warnings and
    the note is empty, it was changed meanwhile, holds nothing of what is to be taken, its areas
    form no tree, or its totals cannot be summed.
    """
    sound = require_ready(session, upload_id=upload_id, note=note, by=by)
    tell(0, len(STAGES), STAGES[0])
    parsed = read(session, sound.upload)
    tell(1, len(STAGES), STAGES[1])
    change = change_of(session, sound, parsed, taking)
    prepared = editions.prepare(session, change)
    masked = masking.mask_of(session, change)
    tell(2, len(STAGES), STAGES[2])
    with transaction(session):
        editions.require_base(session, change.collection, change.base)
        uploads.require_unchanged(session, sound.upload)
        made = editions.write(session, prepared, by=by.name, note=note.strip(), at=now)
        masking.keep(session, change, made.number, masked, at=now)
    return made


def require_ready(session: Session, *, upload_id: int, note: str, by: Viewer) -> Sound:
    """All that can be told without reading the files again. Raises: as `commit_upload` does."""
    by.require(Right.COMMIT)
    sound = require_sound(uploads.find(session, upload_id))
    if sound.warnings and not note.strip():
        raise Refused(
            "Upload {upload} has {count} warnings and no note. Look at each; then say in the note "
            "why the figures may stand.",
            upload=upload_id,
            count=sound.warnings,
        )
    standing = editions.newest_standing(session, sound.upload.collection)
    if (number := standing.number if standing else 0) != sound.base:
        raise Stale(sound.base, number)
    return sound


def require_sound(upload: Upload) -> Sound:
    """The upload as one that may become an edition. Raises: Refused, saying what is missing."""
    require_draft(upload)
    if upload.basis is None or upload.base is None or upload.reader != READER:
        raise Refused(
            "Upload {upload} has not been checked as it stands now. Map its columns, state the "
            "basis and run the checks.",
            upload=upload.id,
        )
    report = Report.from_json(upload.report)
    _require_no_errors(upload, report.errors)
    return Sound(upload, upload.basis, upload.base, warnings=len(report.warnings), rows=report.rows)


def read(session: Session, upload: Upload) -> Parsed:
    """The kept bytes, read again with the kept mapping. Raises: Refused where they have errors."""
    parsed = parse(handed(session, upload), None, warn=False)
    _require_no_errors(upload, parsed.errors)
    return parsed


def change_of(session: Session, sound: Sound, parsed: Parsed, taking: Taking) -> Change:
    """What would be written. Raises: Refused, as `made_of` does."""
    code = sound.upload.collection
    base = 0 if taking.gives_way == "all" else sound.base
    stood = Base(
        areas.listing(session, code, base) if base else (),
        breaks.listing(session, code, base) if base else (),
        lambda selection: schedules.load(session, code, base, selection),
        causes.listing(session, code, base) if base else (),
        lambda: schedules.held(session, code, base) if base else (),
    )
    made = made_of(parsed, taking, stood)
    return Change(
        collection=code,
        base=sound.base,
        cells=made.cells,
        areas=made.areas,
        basis=sound.basis,
        upload=sound.upload.id,
        replace=taking.gives_way == "all",
        ended=made.ended,
        taking=taking,
        ended_areas=made.ended_areas,
        breaks=made.breaks,
        ended_breaks=made.ended_breaks,
        causes=made.causes.causes,
        ended_causes=made.causes.ended,
    )


def _require_no_errors(upload: Upload, errors: Sequence[Problem]) -> None:
    if errors:
        raise Refused(
            "Upload {upload} has {count} errors and cannot become an edition. The first: {first} "
            "Correct the file and hand it in again.",
            upload=upload.id,
            count=len(errors),
            first=str(errors[0]),
        )
