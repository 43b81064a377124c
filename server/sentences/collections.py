"""What is said of collections in a row."""

import datetime as dt

from server.sentences.dates import day
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _, n_


def answer(count: int, standing: int) -> Sentence:
    """How many there are; `standing` of them have an edition that stands."""
    if not count:
        return phrase(_("There is no collection yet. {begin}"), begin=Piece(_("Begin here."), "/"))
    if count == standing:
        return phrase(n_("One collection can be read.", "{count} collections can be read.", count))
    if not standing:
        return phrase(
            n_(
                "There is one collection, without an edition that stands.",
                "There are {count} collections, none with an edition that stands.",
                count,
            )
        )
    return phrase(
        _(
            "There are {count} collections; {standing} can be read.",
            count=count,
            standing=n_("one of them", "{count} of them", standing),
        )
    )


def edition(number: int, made: dt.date, note: str) -> str:
    """The edition that stands, and what its makers say of it."""
    if note:
        return _(
            "Edition {number} stands, made on {day}: {note}",
            number=number,
            day=day(made),
            note=note,
        )
    return _("Edition {number} stands, made on {day}.", number=number, day=day(made))


def nothing_stands(code: str, made: int) -> Sentence:
    """No edition can be gone to: what there is instead. `made`: how many there have been."""
    if not made:
        return phrase(
            _("It has no edition yet. {upload} to make one, or look at {uploads}."),
            upload=Piece(_("Upload files"), f"/uploads/new?collection={code}"),
            uploads=Piece(_("what has been uploaded"), "/uploads"),
        )
    return phrase(
        _("No edition of it stands. {upload} to make one, or look at {uploads} and {editions}."),
        upload=Piece(_("Upload files"), f"/uploads/new?collection={code}"),
        uploads=Piece(_("what has been uploaded"), "/uploads"),
        editions=Piece(_("editions that were withdrawn"), f"/c/{code}/editions"),
    )
