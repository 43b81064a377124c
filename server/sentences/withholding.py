"""What is withheld and why, in words."""

from collections.abc import Sequence

from server.sentences.basis import in_a_row
from server.sentences.names import listed
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _, n_

Told = tuple[str, str] | None
MOST = 8  # ages named


def withheld(ages: Sequence[str]) -> Told:
    """A caution beside figures that rest on withheld counts."""
    what = (
        n_(
            "The deaths at {ages} are withheld: so few that a person might be recognised, or needed"
            " to keep such a number from being worked out.",
            "The deaths at {ages} are withheld: so few that a person might be recognised, or needed"
            " to keep such numbers from being worked out.",
            len(ages),
            ages=listed(ages, most=MOST),
        )
        if ages
        else _("Some of the counts behind these figures are withheld, since they are very small.")
    )
    return (
        _("Withheld"),
        what
        + " "
        + _(
            "Estimates from what is shown stand in for them, so the figures here may be a little"
            " off, and no further decimals of them are given."
        ),
    )


def behind(who: Sequence[str]) -> Told:
    """A caution beside many figures, some of which rest on withheld counts."""
    if not who:
        return None
    return _("Withheld"), _(
        "Some counts behind the figures of {who} are withheld, since they are very small."
        " Estimates from what is shown stand in for them, so these figures may be a little off,"
        " and no further decimals of them are given.",
        who=listed(who, most=MOST),
    )


def ways(links: Sequence[Piece]) -> tuple[Sentence, ...]:
    """Where fewer counts are withheld; nothing where there are no such places."""
    if not links:
        return ()
    return ((*phrase(_("With less withheld: ")), *in_a_row(links), Piece(".")),)
