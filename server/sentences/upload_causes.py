"""What is said of the deaths of an upload by cause."""

from server.sentences.numbers import whole
from server.sentences.text import _, n_


def without_cause() -> str:
    """In place of a label."""
    return _("cause not stated")


def placed(causes: int, deaths: float, without: float) -> str:
    """How many deaths fall into how many causes, and how many into none."""
    said = n_(
        "{deaths} deaths fall into one cause of the list.",
        "{deaths} deaths fall into {count} causes of the list.",
        causes,
        deaths=whole(deaths),
    )
    if not without:
        return said
    rest = _("{deaths} have no cause and are shown so.", deaths=whole(without))
    return f"{said} {rest}"


def how() -> str:
    return _(
        "Deaths that do not state their sex, age or area are shared out cause by cause, by the "
        "deaths of the same cause that do; the deaths of all causes are the sum."
    )
