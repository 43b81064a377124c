"""Breaks and years of shock in words."""

from collections.abc import Sequence
from typing import Protocol

from server.sentences import names
from server.sentences.basis import Told
from server.sentences.numbers import number
from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _, n_


class Break(Protocol):
    """What is told of a break."""

    @property
    def period(self) -> str: ...
    @property
    def kind(self) -> str: ...
    @property
    def note(self) -> str: ...
    @property
    def ratio(self) -> float | None: ...
    @property
    def ratio_error(self) -> float | None: ...


def kind(code: str) -> str:
    """What changed, inside a sentence."""
    return {
        "boundary": _("new boundaries"),
        "coding": _("new coding of causes"),
        "definition": _("new definition"),
        "population": _("new population base"),
        "shock": _("year of shock"),
    }[code]


def label(one: Break, of: str = "") -> str:
    """On a chart; `of` is the area where it is not that of every line."""
    if of:
        return _("{year}: {kind}, {area}", year=one.period, kind=kind(one.kind), area=of)
    return _("{year}: {kind}", year=one.period, kind=kind(one.kind))


def short(code: str) -> str:
    """The same on the phone."""
    return {
        "boundary": _("boundaries"),
        "coding": _("coding"),
        "definition": _("definition"),
        "population": _("base"),
        "shock": _("shock"),
    }[code]


def told(one: Break) -> str:
    """In a list: the year, what changed, and why where it is said in few words."""
    if one.note:
        return _("{year}, {kind} ({note})", year=one.period, kind=kind(one.kind), note=one.note)
    return _("{year}, {kind}", year=one.period, kind=kind(one.kind))


def second(several: Sequence[Break]) -> str:
    """Under a year in a table: what holds from it on, or that it is one of shock."""
    shocks = [one for one in several if one.kind == "shock"]
    parts = list(dict.fromkeys(kind(one.kind) for one in several if one.kind != "shock"))
    said = [_("from here on: {kinds}", kinds=names.listed(parts))] if parts else []
    return "; ".join(said + [kind("shock")] * bool(shocks))


def parted(several: Sequence[Break]) -> Sentence:
    """That a line stops, and why; in the lead of a trend."""
    said = "; ".join(dict.fromkeys(map(told, several)))
    return phrase(
        n_(
            "A break parts these years, and nothing is told across it: {said}.",
            "{count} breaks part these years, and nothing is told across them: {said}.",
            len({(one.period, one.kind) for one in several}),
            said=said,
        )
    )


def before(who: str, first: str, last: str, change: str) -> str:
    """What changed in the years before a break."""
    return _(
        "{who} {change} from {first} to {last}", who=who, change=change, first=first, last=last
    )


def before_all(said: Sequence[str]) -> Sentence:
    return phrase(_("Before that: {said}.", said="; ".join(said))) if said else ()


def left_out(years: Sequence[str]) -> Sentence:
    """Years of shock, drawn but not measured from or to."""
    if not years:
        return ()
    return phrase(
        n_(
            "{years}, a year of shock, is drawn, but no change is measured from it or to it.",
            "{years}, years of shock, are drawn, but no change is measured from them or to them.",
            len(years),
            years=names.listed(list(years)),
        )
    )


def lies_between(several: Sequence[Break], first: str, last: str) -> Told:
    """Beside a comparison of two years that a break parts."""
    if not several:
        return None
    said = "; ".join(dict.fromkeys(map(told, several)))
    return _("A break between"), _(
        "Between {first} and {last} lies {said}. The difference holds what this changed too, and"
        " is no change of mortality alone.",
        first=first,
        last=last,
        said=said,
    )


def mixed(several: Sequence[Break], who: str) -> Told:
    """Beside a figure of added years that lie on both sides of a break."""
    if not several:
        return None
    said = "; ".join(dict.fromkeys(map(told, several)))
    return _("A break within"), _(
        "The years added up for {who} lie on both sides of {said}: the figure is a mixture.",
        who=who,
        said=said,
    )


def ratio(one: Break) -> str:
    """A comparability ratio with its standard error."""
    if one.ratio is None or one.ratio_error is None:
        return ""
    return _(
        "{ratio} (standard error {error})",
        ratio=number(one.ratio, 4),
        error=number(one.ratio_error, 4),
    )


def note_of_ratios(several: Sequence[Break]) -> str:
    """Under the table: how ratios are used."""
    if not any(one.ratio for one in several):
        return ""
    return _(
        "A comparability ratio is the deaths counted after a change of coding over those counted"
        " before it. It is stated here and not applied to any figure."
    )


def cut_off(several: Sequence[Break], year: str) -> Told:
    """Beside a year that a break parts from the year before."""
    if not several:
        return None
    said = "; ".join(dict.fromkeys(map(told, several)))
    return _("A break before"), _(
        "{year} is the first year of another kind: {said}. It is not set against the year before.",
        year=year,
        said=said,
    )
