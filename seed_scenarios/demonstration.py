"""The demonstration: its collections, each told by a story of its own."""

import datetime as dt
from collections.abc import Collection

from seed_scenarios import quillmere, quillmere_causes
from server.actions import Session

CODE = quillmere.CODE  # the collection a reader is led to
_STORIES = {story.CODE: story.build for story in (quillmere, quillmere_causes)}


def lacking(there: Collection[str]) -> tuple[str, ...]:
    """Codes of its collections that are not among these."""
    return tuple(code for code in _STORIES if code not in there)


def build(session: Session, *, now: dt.datetime, there: Collection[str] = ()) -> None:
    """Load the collections that are not there yet."""
    for code in lacking(there):
        _STORIES[code](session, now=now)
