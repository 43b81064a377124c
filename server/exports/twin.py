"""What a page gives to its twins: everything but the pictures."""

from dataclasses import dataclass

from server.exports.table import Table

Told = tuple[str, str]  # a word and what it says


@dataclass(frozen=True, slots=True)
class Twin:
    title: str
    address: str  # canonical, of the page
    about: tuple[Told, ...]  # edition, settings
    notices: tuple[Told, ...]
    cautions: tuple[Told, ...]
    tables: tuple[Table, ...]
