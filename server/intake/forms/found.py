"""What the making of a table finds on its way; the checks of files give it words."""

from collections.abc import Iterable
from dataclasses import dataclass

from server.intake.problems import Fault


@dataclass(frozen=True, slots=True)
class Found:
    """A fault of the kind that the check `key` describes."""

    key: str
    fault: Fault


def faults(found: Iterable[Found], key: str) -> list[Fault]:
    return [one.fault for one in found if one.key == key]
