"""Keys that name ages or a population: one maker for all of a kind, so that none is listed."""

import re
from collections.abc import Callable
from dataclasses import dataclass

from engine.indicator import Indicator

AGE = "(0|[1-9][0-9]{0,2})"  # in completed years, spelt in one way only
OLDEST = 120


@dataclass(frozen=True, slots=True)
class Pattern:
    """A kind of key and what makes its entry from the ages, or the code, in it."""

    example: str
    key: re.Pattern[str]
    make: Callable[..., Indicator]

    def find(self, key: str) -> Indicator | None:
        """The entry, or None where the key is of another kind."""
        found = self.key.fullmatch(key)
        if not found:
            return None
        return self.make(*(int(part) if part.isdigit() else part for part in found.groups()))


def require_ages(*ages: int) -> None:
    """Raises: ValueError where an age is above 120, or two do not rise."""
    if list(ages) != sorted(set(ages)) or max(ages) > OLDEST:
        raise ValueError(
            f"the ages {' and '.join(map(str, ages))} make no indicator; ages rise from the first"
            f" to the last and are at most {OLDEST}"
        )
