"""What is withheld and why, in words."""

from collections.abc import Sequence

from server.sentences.basis import in_a_row
from server.sentences.names import listed
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _

Told = tuple[str, str] | None
MOST = 8  # populations named
FEW = 2  # ages named


def withheld(ages: Sequence[str]) -> Told:
    """A caution beside figures that rest on withheld counts."""
    if not ages:
        what = _("Some counts behind these figures are withheld")
    elif len(ages) <= FEW:
        what = _("The deaths at {ages} are withheld", ages=listed(ages))
    else:
        what = _("The deaths at {count} ages are withheld", count=len(ages))
    return _("Withheld"), _("{what}; estimates stand in for them.", what=what)


def rounded(base: int, also: Told = None) -> Told:
    """A caution beside figures that rest on rounded counts; `also` withheld ones."""
    said = _(
        "Counts are rounded at random, up or down, to multiples of {base}, so that nil may be up to"
        " {most}; all figures are worked out from these.",
        base=base,
        most=base - 1,
    )
    return _("Rounded"), f"{said} {also[1]}" if also else said


def behind(who: Sequence[str]) -> Told:
    """A caution beside many figures, some of which rest on withheld counts."""
    if not who:
        return None
    return _("Withheld"), _(
        "Some counts behind {who} are withheld; estimates stand in for them.",
        who=listed(who, most=MOST),
    )


def ways(links: Sequence[Piece], policy: str) -> tuple[Sentence, ...]:
    """Where fewer counts are withheld, and the page that says what is and why."""
    why = phrase("{link}.", link=Piece(_("What of small counts is shown, and why"), policy))
    less = (*phrase(_("With less withheld: ")), *in_a_row(links), Piece("."))
    return (less, why) if links else (why,)
