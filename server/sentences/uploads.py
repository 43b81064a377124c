"""What is said of files handed in, before they are an edition."""

from collections.abc import Sequence

from server.sentences import names
from server.sentences.numbers import whole
from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _


def things(count: int) -> str:
    """A small number in words."""
    words = (
        _("nothing"),
        _("one thing"),
        _("two things"),
        _("three things"),
        _("four things"),
        _("five things"),
        _("six things"),
        _("seven things"),
        _("eight things"),
        _("nine things"),
    )
    return words[count] if count < len(words) else _("{count} things", count=whole(count))


def answer(files: Sequence[str], errors: int, warnings: int) -> Sentence:
    """Whether an edition can be made, and what stands in the way."""
    listed = names.listed(list(files))
    if errors and warnings:
        text = _(
            "{files} cannot become an edition yet: {errors} must be put right, and {warnings} "
            "should be looked at again."
        )
    elif errors:
        text = _("{files} cannot become an edition yet: {errors} must be put right.")
    elif warnings:
        text = _("{files} can become an edition, but {warnings} should be looked at again.")
    else:
        text = _("{files} can become an edition: every check was passed.")
    return phrase(text, files=listed, errors=things(errors), warnings=things(warnings))


def outcome(errors: int, warnings: int, rows: int, sound: int) -> str:
    """The same for a terminal."""
    return _(
        "{rows} rows were read; {sound} are sound. To be put right: {errors}; to be looked at "
        "again: {warnings}.",
        rows=whole(rows),
        sound=whole(sound),
        errors=whole(errors),
        warnings=whole(warnings),
    )


def read_rows(rows: int, sound: int) -> Sentence:
    return phrase(
        _("{rows} rows were read; {sound} are sound."), rows=whole(rows), sound=whole(sound)
    )
