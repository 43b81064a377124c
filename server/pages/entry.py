"""An entry of a list: a name and facts in words."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Entry:
    key: str  # its anchor on the page
    label: str
    symbol: str  # beside the label; may be empty
    facts: tuple[tuple[str, str], ...]  # a word, and what holds
