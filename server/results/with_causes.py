"""What is asked of one area, sex and year where deaths by cause may have a part."""

from dataclasses import dataclass
from typing import Self
from urllib.parse import urlencode

from server.results.causes import CauseChoice
from server.results.keys import CAUSE_KEYS, Items, Keys
from server.results.questions import PopulationYearQuestion


@dataclass(frozen=True, slots=True)
class CausesOfOne(PopulationYearQuestion):
    """A question about a population-year that spells how causes are shown."""

    causes: CauseChoice | None = None

    @classmethod
    def parse(cls, items: Items) -> Self:
        keys = Keys(items, populations=("of",), once=(*CAUSE_KEYS, "figures", "settings"))
        return cls(keys.population("of"), keys.figures(), keys.settings(), keys.causes())

    def canonical(self) -> str:
        pairs = [("of", self.of.code), *(self.causes.pairs if self.causes else [])]
        return urlencode([*pairs, ("figures", self.figures), ("settings", self.settings)])
