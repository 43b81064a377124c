"""Say what an edition would change, before it is made. Nothing is written."""

from server.accounts.viewer import Right, Viewer
from server.actions.commit_upload import change_of, read, require_sound
from server.actions.taking import taken
from server.actions.totals import giving_way
from server.results.preview import Preview, preview
from server.store import areas, editions, schedules, uploads
from server.store.connect import Session
from server.store.errors import Refused, Stale
from server.store.records import GIVES_WAY, Selection, Taking

EVERYTHING = Selection(cause=None)


def preview_upload(
    session: Session, *, upload_id: int, taking: Taking, by: Viewer
) -> Preview | None:
    """By the same steps as the commit; what it would refuse is the preview's `refusal`. None where
    the upload is not sound.

    Raises: NotAllowed; Missing.
    """
    by.require(Right.READ)
    upload = uploads.find(session, upload_id)
    try:
        sound = require_sound(upload)
    except Refused:  # the list of problems says why
        return None
    standing = editions.newest_standing(session, upload.collection)
    number = standing.number if standing else 0
    try:
        if number != sound.base:
            raise Stale(sound.base, number)
        parsed = read(session, upload)
        change = change_of(session, sound, parsed, taking)
    except Refused as refusal:
        return Preview(number, taking, refusal)
    base = schedules.load(session, upload.collection, number, EVERYTHING) if number else {}
    stood = areas.listing(session, upload.collection, number) if number else ()
    handed, _ = taken(parsed, taking, stood)
    drops = {
        choice: len(giving_way(base, handed, Taking(gives_way=choice)) - change.cells.keys())
        for choice in GIVES_WAY
    }
    return preview(change, base, stood, drops)
