"""Say what an edition would change, before it is made. No edition is written."""

from server.accounts.viewer import Right, Viewer
from server.actions.commit_upload import Sound, change_of, read, require_sound
from server.actions.taking import taken
from server.actions.totals import giving_way
from server.intake.parsing import Parsed
from server.jobs.executor import Tell, untold
from server.results.preview import Preview, asked, preview
from server.store import areas, editions, foreseen, schedules, uploads
from server.store.connect import Session, transaction
from server.store.errors import Refused, Stale
from server.store.records import GIVES_WAY, Selection, Taking

EVERYTHING = Selection(cause=None)
STAGES = ("reading the files", "comparing with what stands")  # texts of the catalogue


def preview_upload(
    session: Session, *, upload_id: int, taking: Taking, by: Viewer
) -> Preview | None:
    """What was worked out when the upload was checked, or for this choice since; nothing is read
    anew. What the commit would refuse is the preview's `refusal`. None where the upload is not
    sound, or nothing was worked out for this choice.

    Raises: NotAllowed; Missing.
    """
    by.require(Right.READ)
    upload = uploads.find(session, upload_id)
    try:
        sound = require_sound(upload)
    except Refused:  # the list of problems says why
        return None
    standing = editions.newest_standing(session, upload.collection)
    if (number := standing.number if standing else 0) != sound.base:
        return Preview(number, taking, Stale(sound.base, number))
    kept = foreseen.find(session, upload_id, taking=asked(taking), base=number)
    return None if kept is None else Preview.from_json(kept, taking)


def foresee_upload(
    session: Session, *, upload_id: int, taking: Taking, by: Viewer, tell: Tell = untold
) -> None:
    """Read the upload once more and work out what taking this of it would change, for
    `preview_upload` to tell.

    Raises: NotAllowed; Missing; Refused where the upload is not sound or was changed meanwhile;
    Stale.
    """
    by.require(Right.UPLOAD)
    sound = require_sound(uploads.find(session, upload_id))
    tell(0, len(STAGES), STAGES[0])
    parsed = read(session, sound.upload)
    tell(1, len(STAGES), STAGES[1])
    found = worked_out(session, sound, parsed, taking)
    with transaction(session):
        editions.require_base(session, sound.upload.collection, sound.base)
        uploads.require_unchanged(session, sound.upload)
        keep(session, upload_id, found)


def worked_out(session: Session, sound: Sound, parsed: Parsed, taking: Taking) -> Preview:
    """By the same steps as the commit."""
    code, number = sound.upload.collection, sound.base
    try:
        change = change_of(session, sound, parsed, taking)
    except Refused as refusal:
        return Preview(number, taking, refusal)
    base = schedules.load(session, code, number, EVERYTHING) if number else {}
    stood = areas.listing(session, code, number) if number else ()
    handed, _ = taken(parsed, taking, stood)
    drops = {
        choice: len(giving_way(base, handed, Taking(gives_way=choice)) - change.cells.keys())
        for choice in GIVES_WAY
    }
    return preview(change, base, stood, drops)


def keep(session: Session, upload_id: int, found: Preview) -> None:
    """Inside a transaction."""
    taking = asked(found.taking)
    content = found.to_json()
    foreseen.keep(session, upload_id, taking=taking, base=found.base, content=content)
