"""The one catalogue: every word a person reads passes through `_` or `n_`.

The English text is the key. `pseudo` is a made-up language for the tests: it sets each text in ⟦⟧,
so that words which bypassed the catalogue are seen at once.
"""

from collections.abc import Iterator
from contextlib import contextmanager
from contextvars import ContextVar

_LANGUAGE: ContextVar[str] = ContextVar("language", default="en")
LANGUAGES = ("en", "pseudo")


def language() -> str:
    """The language in force, for the html element."""
    return _LANGUAGE.get()


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
    if _LANGUAGE.get() == "pseudo":
        text = f"⟦{text}⟧"
    return text.format(**values) if values else text


def n_(one: str, many: str, count: int, /, **values: object) -> str:
    """Singular or plural by `count`, which is also the value of {count} unless given."""
    return _(one if count == 1 else many, **{"count": count, **values})
