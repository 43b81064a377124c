"""What is asked about the causes of death in a file, and how they fall into a list."""

from server.sentences.numbers import whole
from server.sentences.reading import Options
from server.sentences.reading_form import choose, quoted
from server.sentences.text import _, n_


def cause_list_label() -> str:
    return _("Causes of death fall into")


def cause_lists() -> Options:
    return (
        choose(),
        (
            "short",
            _("a short list for public health: some 40 causes in groups, by codes of ICD-10"),
        ),
        ("chapters", _("the chapters of ICD-10")),
        ("own", _("a list of our own, a table handed in with the deaths")),
    )


def cause_list_hint() -> str:
    return _("all years of a collection go by one list; shown again, you see how the codes fall")


def fallen(codes: int, causes: int, sums: tuple[str, ...]) -> str:
    """How codes or names fell into the list that was chosen."""
    said = _(
        "{codes} codes or names fall into {causes} causes of the list.",
        codes=whole(codes),
        causes=whole(causes),
    )
    if not sums:
        return said
    kept = _("Sums, compared with the causes that stand beside them: {texts}.", texts=quoted(sums))
    return f"{said} {kept}"


def not_in_list(lost: tuple[str, ...]) -> str:
    """Codes that no cause of the list holds; empty where there are none."""
    if not lost:
        return ""
    return n_(
        "In no cause of the list, and refused: {texts}.",
        "In no cause of the list, and refused ({count}): {texts}.",
        len(lost),
        texts=quoted(lost),
    )


def cause_list_missing() -> str:
    return _("Say which list the causes fall into.")
