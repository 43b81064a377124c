"""How far provisional figures moved before, said beside every one of them."""

import math
from dataclasses import dataclass

from server.sentences.numbers import number, whole
from server.sentences.text import _, n_

Told = tuple[str, str]


@dataclass(frozen=True, slots=True)
class Moves:
    """Sizes of moves: of life expectancy in years, of deaths as shares; nan where unknown."""

    count: int  # areas, sexes and years
    years: int
    median: float
    most: float
    who: str  # where it moved most
    median_deaths: float
    most_deaths: float


def told(moves: Moves | None) -> Told:
    """The caution; None: no provisional figure was handed in again yet."""
    word = _("Moved before")
    if moves is None or not moves.count:
        return word, _(
            "No provisional year of this collection had been revised when this edition was made, "
            "so how far such figures move is not known."
        )
    what = n_(
        "Of one provisional figure handed in again",
        "Of {count} provisional figures handed in again",
        moves.count,
        count=whole(moves.count),
    )
    if math.isnan(moves.median):
        return word, _(
            "{what} none had a life expectancy both times, so how far it moves is not known.",
            what=what,
        )
    return word, _(
        "{what}, in {years}, life expectancy at birth moved by {median} of a year in the middle "
        "and at most by {most}, for {who}; the deaths by {deaths} and at most by {most_deaths}.",
        what=what,
        years=n_("one year", "{count} years", moves.years),
        median=number(moves.median, 2),
        most=number(moves.most, 2),
        who=moves.who,
        deaths=percent(moves.median_deaths),
        most_deaths=percent(moves.most_deaths),
    )


def percent(share: float) -> str:
    """A share as a percentage with one decimal; what is not known says so."""
    if math.isnan(share):
        return _("an unknown share")
    return f"{number(100 * share, 1)}\N{NO-BREAK SPACE}%"
