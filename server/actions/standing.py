"""The base of an upload, read for its checks."""

from server.intake.standing import Standing
from server.store import areas, breaks, causes, editions, schedules
from server.store.connect import Session
from server.store.records import Selection

RATED = Selection(measures=("deaths", "person_years"))
NEWEST = 3  # years whose deaths by cause are looked at


def standing(session: Session, collection: str, number: int) -> Standing:
    """What edition `number` holds (0: nothing). Five statements, seven where it has causes."""
    edition = editions.find(session, collection, number)
    if edition is None:
        return Standing()
    held = schedules.held(session, collection, number)
    cells = schedules.load(session, collection, number, RATED)
    if parted := sorted({key.period for key in held if key.cause}):
        by_cause = Selection(measures=("deaths",), periods=tuple(parted[-NEWEST:]), cause=None)
        cells = {**cells, **schedules.load(session, collection, number, by_cause)}
    return Standing(
        areas.listing(session, collection, number),
        held,
        edition.basis,
        breaks.listing(session, collection, number),
        cells,
        causes.listing(session, collection, number) if parted else (),
    )
