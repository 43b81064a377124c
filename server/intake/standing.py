"""What the edition that stands holds, as far as checks of an upload must know it."""

from collections.abc import Mapping
from dataclasses import dataclass, field

from engine.ages import AgeGrid
from server.store.records import Area, Basis, Break, Key


@dataclass(frozen=True, slots=True)
class Standing:
    """The base that an upload is laid over; empty where nothing stands, or all is replaced.

    Checks read it; the schedules made of an upload do not depend on it.
    """

    areas: tuple[Area, ...] = ()  # in tree order
    held: Mapping[Key, AgeGrid] = field(default_factory=dict)  # every schedule and its age groups
    basis: Basis | None = None
    breaks: tuple[Break, ...] = ()

    def holds(self, area: str, sex: str, period: str, measure: str) -> bool:
        return Key(area, sex, period, measure) in self.held
