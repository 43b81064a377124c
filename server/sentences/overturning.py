"""What would overturn a claim: how far counts would have to be wrong, beside what is known of late
deaths."""

import math
from dataclasses import dataclass

from server.sentences.movements import Movement
from server.sentences.numbers import number
from server.sentences.text import _

Told = tuple[str, str] | None
LEAST = 0.05  # per cent; less prints as nothing
MOST = 30.0  # per cent: an error so large is not what one looks for


@dataclass(frozen=True, slots=True)
class Needed:
    """By how many per cent the deaths of a side, at all ages alike, would have to be others."""

    who: str
    deaths: float  # signed


def told(kind: Movement, needed: Needed | None, late: str) -> Told:
    """What would make a clear difference unclear, or an unclear one clear. `late` says how far
    provisional deaths moved before, empty where nothing shown is provisional."""
    if needed is None or not math.isfinite(needed.deaths):
        return None
    size = abs(needed.deaths)
    people = 100 * (1 / (1 + needed.deaths / 100) - 1)
    parts = {
        "who": needed.who,
        "deaths": _percent(size),
        "people": _percent(abs(people)),
    }
    clear = kind not in (Movement.NOT_CLEAR, Movement.TOO_SMALL)
    if size > MOST:
        text = (
            _(
                "No error of the counts below {most} % would take the difference away.",
                most=f"{MOST:.0f}",
            )
            if clear
            else _(
                "No error of the counts below {most} % would make a clear difference.",
                most=f"{MOST:.0f}",
            )
        )
    elif clear:
        text = (
            _(
                "With {deaths} more deaths of {who} than counted, or {people} fewer people, at all"
                " ages alike, the difference would no longer be clear.",
                **parts,
            )
            if needed.deaths > 0
            else _(
                "With {deaths} fewer deaths of {who} than counted, or {people} more people, at all"
                " ages alike, the difference would no longer be clear.",
                **parts,
            )
        )
    else:
        text = (
            _(
                "With {deaths} more deaths of {who} than counted, or {people} fewer people, at all"
                " ages alike, the difference would be clear.",
                **parts,
            )
            if needed.deaths > 0
            else _(
                "With {deaths} fewer deaths of {who} than counted, or {people} more people, at all"
                " ages alike, the difference would be clear.",
                **parts,
            )
        )
    return _("What would overturn it"), f"{text} {late}".rstrip()


def _percent(size: float) -> str:
    text = number(max(size, 2 * LEAST), 1)
    words = text if size >= LEAST else _("less than {bound}", bound=text)
    return f"{words}\N{NO-BREAK SPACE}%"


def late_deaths(middle: str, most: str) -> str:
    """How far the deaths of provisional years moved before; shares as printed."""
    return _(
        "Late deaths moved those of provisional years by {middle} in the middle before, and at most"
        " by {most}.",
        middle=middle,
        most=most,
    )


def late_unknown() -> str:
    return _("How many deaths are reported late is not known yet.")
