"""A problem: what kept an address or a form from being answered."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Problem:
    """As in RFC 9457; every text has passed the catalogue."""

    status: int
    title: str  # of the kind: "No such page"
    detail: str  # of this one: where, what was found, what was expected, what to do
    asked: str  # the address
    request_id: str
    errors: tuple[str, ...] = ()  # one sentence each, where there are several


class Refusal(Exception):
    """Refused where no error class of another room says it. Title and text are of the catalogue;
    whoever shows them passes them through it, with `values` for the text's {names}."""

    def __init__(self, status: int, title: str, text: str, **values: object) -> None:
        super().__init__(text.format(**values) if values else text)
        self.status, self.title, self.text, self.values = status, title, text, values
