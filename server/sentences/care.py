"""What a page owes its readers where it names suicide, overdose or violence."""

from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from contextvars import ContextVar
from typing import Protocol

from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _

_HELP_LINE: ContextVar[str] = ContextVar("help_line", default="")


class Named(Protocol):
    """A cause of death as a page names it."""

    @property
    def care(self) -> str:
        """One of the store's CARE; empty: none."""


@contextmanager
def helped_by(text: str) -> Iterator[None]:
    """Inside, pages give this text of the operator (EBBLINE_HELP_LINE); empty: a neutral one."""
    token = _HELP_LINE.set(text.strip())
    try:
        yield
    finally:
        _HELP_LINE.reset(token)


def help_line() -> str:
    """The operator's text in force, empty where there is none: what a page that names such causes
    depends on besides its address."""
    return _HELP_LINE.get()


def needed(causes: Iterable[Named]) -> bool:
    """Whether a page that names these causes carries the text."""
    return any(one.care for one in causes)


def told(causes: Iterable[Named]) -> Sentence:
    """The text for a page that names these causes; empty where none of them needs it.

    It stands with the answer, before the figures. The page itself tells no method of dying, ranks
    no place by such deaths, and gives them no cause.
    """
    if not needed(causes):
        return ()
    own = help_line()
    if own:
        return phrase("{text}", text=own)
    return phrase(
        _(
            "Some of the deaths counted here are hard to read about. If you, or somebody you know,"
            " are in distress, you need not be alone with it: a doctor, or a help line of your"
            " country, will listen, and in an emergency so will the emergency number."
        )
    )
