"""What the store refuses, as catalogue text and the values that fill it.

`text` is the English catalogue text with {names}, `values` fills them: whoever shows the refusal
passes both through the catalogue (`_(error.text, **error.values)`); `str(error)` is the English.
"""

from collections.abc import Iterable


class Refused(Exception):
    """The question or the change cannot be had as it stands; says why and what to do."""

    def __init__(self, text: str, **values: object) -> None:
        self.text = text
        self.values = values
        super().__init__(text.format(**values) if values else text)


class Missing(Refused):
    """Nothing of this kind has this code. `known` lists those there are; None: not listed."""

    def __init__(self, kind: str, code: object, known: Iterable[object] | None = None) -> None:
        self.kind, self.code = kind, str(code)
        self.known = tuple(str(one) for one in known or ())
        if self.known:
            text = "There is no {kind} {code}; known: {known}."
        elif known is not None:
            text = "There is no {kind} {code}, nor any other yet."
        else:
            text = "There is no {kind} {code}."
        super().__init__(text, kind=kind, code=self.code, known=", ".join(self.known))


class Stale(Refused):
    """Another edition stands than the one the checks ran against."""

    def __init__(self, checked: int, standing: int) -> None:
        self.checked, self.standing = checked, standing
        super().__init__(
            "The checks ran against {checked}, but {standing} stands now. "
            "Check the upload again, then commit it.",
            checked=_named(checked),
            standing=_named(standing),
        )


class Unreachable(Refused):
    """There is no database to be had at this address."""

    def __init__(self, place: str, why: object) -> None:
        super().__init__(
            "The database at {place} cannot be opened: {why}. Check EBBLINE_DATA and "
            "EBBLINE_DATABASE_URL.",
            place=place,
            why=str(why).partition("\n")[0].rstrip("."),
        )


class Taken(Refused):
    """The code is in use."""

    def __init__(self, kind: str, code: str) -> None:
        super().__init__(
            "There is a {kind} {code} already. Choose another code.", kind=kind, code=code
        )


def _named(number: int) -> str:
    return f"edition {number}" if number else "no edition"
