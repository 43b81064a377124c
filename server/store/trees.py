"""Lists whose entries are parts of one another."""

from collections.abc import Iterable
from typing import Protocol, TypeVar


class Part(Protocol):
    """An entry of a tree."""

    @property
    def code(self) -> str:
        """What it is called by."""

    @property
    def parent(self) -> str:
        """Code of what it is part of; empty at the top."""


Entry = TypeVar("Entry", bound=Part)


def from_tops(entries: Iterable[Entry]) -> tuple[Entry, ...]:
    """Each before its parts, siblings in the order given. Those that are part of themselves, or of
    what is not there, are not among them."""
    parts: dict[str, list[Entry]] = {}
    for entry in entries:
        parts.setdefault(entry.parent, []).append(entry)
    ordered: list[Entry] = []
    waiting = parts.pop("", [])[::-1]
    while waiting:
        entry = waiting.pop()
        ordered.append(entry)
        waiting.extend(parts.pop(entry.code, [])[::-1])
    return tuple(ordered)
