"""By how much a newer edition moves a page's headline: exact, since it is no matter of chance."""

import datetime as dt
from collections.abc import Callable, Iterable
from dataclasses import dataclass

import numpy as np

from engine import indicators
from engine.settings import Settings
from server.results.loading import Beside, Found, Shared, load
from server.results.questions import PopulationYear
from server.store import editions
from server.store.connect import Session
from server.store.heading import Heading


@dataclass(frozen=True, slots=True)
class Moved:
    """The headline in the newest standing edition; nan where that edition cannot give it."""

    number: int
    made: dt.datetime
    value: float

    def by(self, here: float) -> float:
        """The newer headline less the one here."""
        return self.value - here


def moved(
    session: Session,
    heading: Heading,
    wanted: Iterable[PopulationYear | Shared],
    beside: Beside,
    headline: Callable[[Found], float],
    *,
    figures: str,
) -> Moved | None:
    """None where no edition newer than the heading's stands.

    `headline` answers from those of the population-years wanted that the newer edition holds.
    """
    if heading.newest is None or heading.newest <= heading.edition.number:
        return None
    newer = editions.find(session, heading.collection.code, heading.newest)
    if newer is None:
        return None
    held = load(session, heading.collection.code, newer.number, wanted, beside, figures=figures)
    return Moved(newer.number, newer.made, headline(held))


def life_expectancy(of: PopulationYear, settings: Settings) -> Callable[[Found], float]:
    """The headline of pages that explain it: nan where it is not held."""

    def headline(newer: Found) -> float:
        if of not in newer:
            return np.nan
        one = indicators.find("e0")
        return float(indicators.estimate(one, newer[of].panel, settings).value)

    return headline
