"""What the results about one population-year share, whatever they say of it."""

from dataclasses import dataclass
from typing import Protocol

from engine.settings import Settings, span
from server.results.holdings import Holdings
from server.results.keys import PopulationYear
from server.results.loading import Loaded
from server.sentences import names
from server.store.heading import Heading


class AboutOne(Protocol):
    """A question about one population-year."""

    @property
    def of(self) -> PopulationYear:
        """Whose figures are asked for."""


@dataclass(frozen=True, slots=True)
class OfOne:
    """One area, sex and year of an edition, and the question it was loaded for."""

    heading: Heading
    holdings: Holdings
    question: AboutOne
    settings: Settings
    loaded: Loaded

    @property
    def of(self) -> PopulationYear:
        return self.question.of

    @property
    def period(self) -> str:
        """The year, or the years added up."""
        return names.years(span(self.of.period, self.settings.years))

    @property
    def name(self) -> str:
        """The area's name."""
        return self.holdings.name(self.of.area)
