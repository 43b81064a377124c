"""Whether the making of an edition takes longer than somebody should wait for an answer."""

from server.actions.commit_upload import Sound
from server.intake.report import Report
from server.store import areas, policies, schedules
from server.store.connect import Session
from server.store.records import Taking

ROWS = 50_000  # read, summed and written in 0.2 s
MASKED = 20_000  # numbers by age that a mask is made of, beside those of every earlier edition: 1 s


def takes_long(session: Session, sound: Sound, taking: Taking) -> bool:
    """By what is handed in, and under a policy by what its mask is made of: all that the edition
    holds of the years it touches."""
    return sound.rows > ROWS or masked(session, sound, taking) > MASKED


def masked(session: Session, sound: Sound, taking: Taking) -> int:
    """How many numbers by age the mask is made of, of all that stands and all that comes; 0 where
    the collection has no policy. Four statements."""
    code = sound.upload.collection
    if policies.newest(session, code) is None:
        return 0
    if not sound.base:
        return sound.rows
    stands = schedules.numbers(session, code, sound.base, _touched(session, sound, taking))
    return stands + sound.rows


def _touched(session: Session, sound: Sound, taking: Taking) -> tuple[str, ...] | None:
    """The years whose mask is made anew; None: all of them."""
    report, code = Report.from_json(sound.upload.report), sound.upload.collection
    stood = {area.code for area in areas.listing(session, code, sound.base)}
    moved = bool(report.becoming or report.breaks) or not set(report.areas) <= stood
    if moved or taking.gives_way in ("areas", "all"):
        return None
    return taking.periods or report.periods
