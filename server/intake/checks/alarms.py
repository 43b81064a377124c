"""How often each check found something where nothing was wrong, as it was measured and is kept."""

import json
from collections.abc import Mapping
from dataclasses import asdict, dataclass
from functools import cache
from pathlib import Path

KEPT = Path(__file__).with_name("false_alarms.json")


@dataclass(frozen=True, slots=True)
class CleanCounts:
    """Clean counts that were looked at."""

    name: str
    lines: int  # areas, sexes and years


@dataclass(frozen=True, slots=True)
class Rate:
    """Findings for 1,000 areas, sexes and years."""

    worst: float  # in any of the data
    where: str  # the name of those
    mean: float  # in all of them together


@dataclass(frozen=True, slots=True)
class FalseAlarms:
    measured: str  # ISO date
    data: tuple[CleanCounts, ...]
    rates: Mapping[str, Mapping[str, float]]  # by name of the data and key of the check

    @property
    def lines(self) -> int:
        """Areas, sexes and years in all."""
        return sum(one.lines for one in self.data)

    @property
    def found(self) -> float:
        """Findings of all checks in them."""
        return sum(one.lines * sum(self.rates[one.name].values()) for one in self.data) / 1000

    def of(self, key: str) -> Rate:
        told = [(one, self.rates[one.name].get(key, 0.0)) for one in self.data]
        worst, rate = max(told, key=lambda each: each[1])
        mean = sum(one.lines * rate for one, rate in told) / self.lines
        return Rate(rate, worst.name, mean)

    def to_json(self) -> str:
        return json.dumps(asdict(self), ensure_ascii=False, indent=1, sort_keys=True) + "\n"

    @classmethod
    def from_json(cls, text: str) -> "FalseAlarms":
        stored = json.loads(text)
        data = tuple(CleanCounts(**one) for one in stored["data"])
        return cls(stored["measured"], data, stored["rates"])


@cache
def kept() -> FalseAlarms:
    """As last measured, by `python -m tests.studies.false_alarms`."""
    return FalseAlarms.from_json(KEPT.read_text(encoding="utf-8"))
