"""The one catalogue: every word a person reads passes through `_` or `n_`.

The English text is the key. `pseudo` is a made-up language for the tests: it sets each text in ⟦⟧,
so that words which bypassed the catalogue are seen at once.
"""

from collections.abc import Iterator
from contextlib import contextmanager
from contextvars import ContextVar

from server.sentences.languages import OTHERS, Signs, translated

_LANGUAGE: ContextVar[str] = ContextVar("language", default="en")
LANGUAGES = ("en", *OTHERS, "pseudo")
_ENGLISH = Signs(".", ",")


def language() -> str:
    """The language in force, for the html element."""
    return _LANGUAGE.get()


def signs() -> Signs:
    """How numbers are printed in the language in force."""
    other = OTHERS.get(_LANGUAGE.get())
    return other.signs if other else _ENGLISH


@contextmanager
def speaking(code: str) -> Iterator[None]:
    """Texts inside are in this language; ValueError lists those there are."""
    if code not in LANGUAGES:
        raise ValueError(
            f"EBBLINE_LANGUAGE is {code!r}, a language there is no catalogue of; there are "
            f"{', '.join(LANGUAGES)}"
        )
    token = _LANGUAGE.set(code)
    try:
        yield
    finally:
        _LANGUAGE.reset(token)


def _(text: str, /, **values: object) -> str:
    """The text in the language in force, with its {names} filled in."""
    code = _LANGUAGE.get()
    if code == "pseudo":
        text = bracketed(text)
    elif code in OTHERS:
        text = translated(code, text)
    return text.format(**values) if values else text


def bracketed(text: str) -> str:
    """In the made-up language."""
    return f"⟦{text}⟧"


def n_(one: str, many: str, count: int, /, **values: object) -> str:
    """Singular or plural by `count`, which is also the value of {count} unless given."""
    return _(one if count == 1 else many, **{"count": count, **values})
