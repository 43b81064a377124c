"""A sentence as data: runs of words, some linked, some set apart."""

import re
from dataclasses import dataclass
from typing import Literal

Emphasis = Literal["", "interval", "strong", "rubric"]


@dataclass(frozen=True, slots=True)
class Piece:
    """A run of words in a sentence, linked where it has an address. `emphasis`: 'interval' is set
    in the second ink, 'strong' bold, 'rubric' as a caution's word."""

    text: str
    href: str = ""
    emphasis: Emphasis = ""


Sentence = tuple[Piece, ...]


def phrase(text: str, /, **parts: "Piece | str") -> Sentence:
    """A text of the catalogue with its {names} filled in by pieces, in the text's own order. What a
    user wrote is handed over as a part, never inside the text, since it may hold braces.

    Raises: KeyError where the text names a part that is not given.
    >>> phrase("See {it}.", it=Piece("edition 2", "/c/x/2/contents"))[1].href
    '/c/x/2/contents'
    """
    pieces = []
    for index, run in enumerate(re.split(r"\{(\w+)\}", text)):
        part = parts[run] if index % 2 else run
        pieces.append(part if isinstance(part, Piece) else Piece(part))
    return tuple(piece for piece in pieces if piece.text)


def plain(sentence: Sentence) -> str:
    """The words alone."""
    return "".join(piece.text for piece in sentence)
