"""What is asked about areas over time and about breaks."""

from collections.abc import Sequence

from server.sentences.breaks import kind
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.reading import Options
from server.sentences.text import _
from server.sentences.uploads import years


def field(role: str, name: str, line: int) -> str:
    """The label of a field of a line."""
    if role == "areas":
        labels = {
            "code": _("Old code {line}", line=line),
            "becomes": _("becomes the code"),
            "from": _("from the year"),
            "to": _("to the year"),
            "share": _("with the share"),
            "name": _("under the name"),
        }
    else:
        labels = {
            "year": _("First year {line}", line=line),
            "kind": _("what changed"),
            "area": _("in the area"),
            "note": _("Why, in a few words"),
        }
    return labels[name]


def hint(name: str) -> str:
    """What an empty field means."""
    return {
        "from": _("empty: from the first year"),
        "to": _("empty: to the last year"),
        "share": _("empty: all of it; else 0.25 or 1/4"),
        "area": _("its code; empty: every area"),
    }.get(name, "")


def kinds(codes: Sequence[str], none: str) -> Options:
    """The kinds of breaks, and the one that ends another."""
    return (
        ("", _("nothing")),
        *((code, kind(code)) for code in codes),
        (none, _("the break of that year falls away")),
    )


def about_areas() -> Sentence:
    return phrase(
        _(
            "Several old codes that become one are added up, exactly, in every year the line names,"
            " those that stand included. One old code that becomes several needs a share for each;"
            " the counts are then marked as estimated. Without shares, and with a first year, the"
            " old series ends there and new ones begin. More lines: {template}."
        ),
        template=Piece("areas.csv", "/templates/areas.csv"),
    )


def about_breaks() -> Sentence:
    return phrase(
        _(
            "A break is a change of boundaries, coding, definition or population base that no trend"
            " crosses; the year is the first of the new kind. A year of shock is drawn, but no"
            " change is measured from it or to it. More lines: {template}."
        ),
        template=Piece("breaks.csv", "/templates/breaks.csv"),
    )


def about_rebase() -> Sentence:
    """The plain offer of a new population alone."""
    return phrase(
        _(
            "{rebase} After a census hand in the population alone. The deaths that stand stay as"
            " they are, with their status; name the new estimate under the basis, and both"
            " editions keep their own."
        ),
        rebase=Piece(_("New population for years already held:"), emphasis="strong"),
    )


def about_causes() -> Sentence:
    return phrase(
        _(
            "{causes} A column of codes of ICD-10 is enough; rows of all causes are kept as a"
            " cross-check. Causes of another classification, or a grouping of your own, need a list"
            " of causes beside the deaths, each time: {template}."
        ),
        causes=Piece(_("Deaths by cause:"), emphasis="strong"),
        template=Piece("causes.csv", "/templates/causes.csv"),
    )


def facts(
    becoming: Sequence[Sequence[str]], breaks: Sequence[Sequence[str]], rebased: Sequence[str]
) -> tuple[tuple[str, str], ...]:
    """What was understood of small tables and of a population alone: word and text."""
    found = []
    if becoming:
        found.append((_("Areas that change"), "; ".join(_becomes(*row) for row in becoming)))
    if breaks:
        found.append((_("Breaks"), "; ".join(_break(*row) for row in breaks)))
    if rebased:
        said = _(
            "{years}: the deaths that stand stay, with their status",
            years=years(rebased),
        )
        found.append((_("New population for years already held"), said))
    return tuple(found)


def _becomes(code: str, first: str, last: str, new: str, way: str) -> str:
    span = _years(first, last)
    texts = {
        "merged": _("{code} is counted under {new}, {span}", code=code, new=new, span=span),
        "shared": _("{code} is shared out to {new}, {span}", code=code, new=new, span=span),
        "ended": _("{code} ends, {new} begin in {first}", code=code, new=new, first=first),
    }
    return texts[way]


def _years(first: str, last: str) -> str:
    if not first and not last:
        return _("in every year")
    if not first:
        return _("up to {last}", last=last)
    if not last:
        return _("from {first} on", first=first)
    return _("from {first} to {last}", first=first, last=last)


def _break(period: str, code: str, area: str) -> str:
    if not code:
        return _("{year}: falls away", year=period)
    if not area:
        return _("{year}: {kind}", year=period, kind=kind(code))
    return _("{year}: {kind}, {area}", year=period, kind=kind(code), area=area)
