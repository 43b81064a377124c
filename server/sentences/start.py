"""What an empty almanac says."""

from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _

TEMPLATES = ("deaths", "population", "births")


def answer() -> Sentence:
    return phrase(
        _(
            "Nothing has been uploaded yet. Two tables are enough to begin: deaths and population, "
            "by year, sex and age."
        )
    )


def lead() -> Sentence:
    return phrase(
        _(
            "Ebbline turns them into life tables and says in words whether people live longer, at "
            "which ages that came about, and how sure one can be."
        )
    )


def templates() -> Sentence:
    """The files to fill in, by their names."""
    return phrase(_("Templates to fill in: {deaths}, {population}, {births}."), **_files())


def _files() -> dict[str, Piece]:
    return {name: Piece(f"{name}.csv", f"/templates/{name}.csv") for name in TEMPLATES}


def steps() -> tuple[Sentence, ...]:
    """What to do with data of one's own, in order."""
    return (
        phrase(
            _(
                "Take a template and fill it in: {deaths}, {population}, and {births} if you have "
                "births. Any long table that has these columns will do."
            ),
            **_files(),
        ),
        phrase(
            _(
                "Upload the files. They are read, checked and shown to you; nothing becomes an "
                "edition until you say so."
            )
        ),
        phrase(
            _(
                "Make them edition 1 of a collection, and pass the address of any page to a "
                "colleague."
            )
        ),
    )


def questions() -> tuple[tuple[str, str], ...]:
    """What the pages answer: the question, and what is shown."""
    return (
        (
            _("How long do people live here?"),
            _("One area, sex and year: the sentence, the figures, the life table."),
        ),
        (
            _("What lies between these two?"),
            _("Any two areas, sexes or years, and the ages that make the difference."),
        ),
        (
            _("Which way is it going?"),
            _("Any figure through the years, with what chance alone could have done."),
        ),
    )
