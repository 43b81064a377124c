"""One line of a form as data: what is asked, what can be answered, what was."""

from dataclasses import dataclass, replace
from typing import Literal

from server.sentences.reading import Options


@dataclass(frozen=True, slots=True)
class Field:
    """A text, or a choice among `options`; `error` is what is wrong with the answer."""

    kind: Literal["text", "select", "radios", "boxes"]
    name: str
    label: str
    value: str = ""
    options: Options = ()
    hint: str = ""
    error: str = ""
    width: Literal["", "wide", "whole"] = ""
    required: bool = False

    def wrong(self, errors: dict[str, str]) -> "Field":
        """With the error of its name, where there is one."""
        return replace(self, error=errors.get(self.name, ""))


def text(name: str, label: str, value: str, **more: object) -> Field:
    return Field("text", name, label, value, **more)  # type: ignore[arg-type]


def select(name: str, label: str, options: Options, value: str, **more: object) -> Field:
    return Field("select", name, label, value, options, **more)  # type: ignore[arg-type]


def radios(name: str, label: str, options: Options, value: str, **more: object) -> Field:
    return Field("radios", name, label, value, options, **more)  # type: ignore[arg-type]
