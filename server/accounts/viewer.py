"""Who looks or acts, and what they may do."""

from dataclasses import dataclass
from enum import Enum


class Right(Enum):
    READ = "read"
    UPLOAD = "upload"
    COMMIT = "commit"
    WITHDRAW = "withdraw"
    ADMINISTER = "administer"


class NotAllowed(Exception):
    """The viewer lacks the right. `text` and `values` are for the catalogue."""

    def __init__(self, viewer: "Viewer", right: Right) -> None:
        self.text = "{name} may not {right} here. Ask the data owner for the right to {right}."
        self.values: dict[str, object] = {"name": viewer.name, "right": right.value}
        super().__init__(self.text.format(**self.values))


@dataclass(frozen=True, slots=True)
class Viewer:
    name: str
    rights: frozenset[Right]

    def may(self, right: Right) -> bool:
        return right in self.rights

    def require(self, right: Right) -> None:
        """Raises: NotAllowed."""
        if not self.may(right):
            raise NotAllowed(self, right)


# on loopback, until there are accounts
LOCAL = Viewer("local analyst", frozenset(Right))
