"""The base of an upload, read for its checks."""

from server.intake.standing import Standing
from server.store import areas, breaks, editions, schedules
from server.store.connect import Session
from server.store.records import Selection

RATED = Selection(measures=("deaths", "person_years"))


def standing(session: Session, collection: str, number: int) -> Standing:
    """What edition `number` holds (0: nothing). Five statements."""
    edition = editions.find(session, collection, number)
    if edition is None:
        return Standing()
    return Standing(
        areas.listing(session, collection, number),
        schedules.held(session, collection, number),
        edition.basis,
        breaks.listing(session, collection, number),
        schedules.load(session, collection, number, RATED),
    )
