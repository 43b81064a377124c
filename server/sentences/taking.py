"""What an edition changes, or would change, of the one it is built on."""

from collections.abc import Mapping, Sequence

from server.sentences import names
from server.sentences.numbers import whole
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _, n_

Counts = Mapping[str, int]  # by added, changed, restated, dropped


def would_change(number: int, base: int, cells: Counts) -> Sentence:
    """The first line: how many counts edition `number` will change of edition `base` (0: none)."""
    if not base:
        return phrase(
            _("Edition {number} will be the first, with {cells}."),
            number=str(number),
            cells=_counts(cells["added"]),
        )
    parts = _parts(cells)
    if not parts:
        return phrase(
            _("Edition {number} will hold the same numbers as edition {base}."),
            number=str(number),
            base=str(base),
        )
    return phrase(
        _("Edition {number} will change edition {base}: {parts}."),
        number=str(number),
        base=str(base),
        parts=names.listed(parts),
    )


def by_cause(count: int) -> Sentence:
    """How many of these counts are deaths by cause; empty where none is."""
    if not count:
        return ()
    return phrase(
        n_(
            "One of these counts is of deaths by cause.",
            "{count} of these counts are of deaths by cause.",
            count,
            count=whole(count),
        )
    )


def not_worked_out() -> Sentence:
    """In place of the first line, where these choices were not looked at yet."""
    return phrase(
        _(
            "What these choices would change has not been worked out yet. Have it shown below; a "
            "large upload is read once more for it."
        )
    )


def _parts(cells: Counts) -> list[str]:
    return [
        text
        for count, text in (
            (cells["added"], _("{cells} new", cells=_counts(cells["added"]))),
            (cells["changed"], _("{cells} changed", cells=_counts(cells["changed"]))),
            (cells["dropped"], _("{cells} dropped", cells=_counts(cells["dropped"]))),
        )
        if count
    ]


def _counts(count: int) -> str:
    return n_("one count", "{count} counts", count, count=whole(count))


def settled(years: Sequence[str], status: str) -> Sentence:
    """That years change their status with no number moving; empty where none does."""
    if not years:
        return ()
    final = (
        "{years} becomes final with no number moving.",
        "{years} become final with no number moving.",
    )
    provisional = (
        "{years} becomes provisional with no number moving.",
        "{years} become provisional with no number moving.",
    )
    texts = final if status == "final" else provisional
    return (Piece(n_(*texts, len(years), years=names.listed(list(years), most=12))),)


def choices(drops: Mapping[str, int] | None) -> tuple[tuple[str, str], ...]:
    """What may give way to the upload, and what each choice drops of what the files do not hold
    (None: not counted)."""
    texts = {
        "cells": _("only the counts of the same area, sex, year and kind"),
        "handed": _("all that it holds of an area and year taken"),
        "years": _("all that it holds of a year taken, in every area"),
        "areas": _("all that it holds of an area taken, in every year"),
        "all": _("all of it"),
    }
    if drops is None:
        return tuple(texts.items())
    return tuple(
        (key, _("{text}: {dropped}", text=text, dropped=_dropped(drops[key])))
        for key, text in texts.items()
    )


def _dropped(count: int) -> str:
    if not count:
        return _("drops nothing beside")
    return n_(
        "drops one column of ages that the files do not hold",
        "drops {count} columns of ages that the files do not hold",
        count,
        count=whole(count),
    )


def did(effect: Counts | None, took: str, *, hidden: bool) -> str:
    """What an edition did to the one before it, in the list of editions. Where counts are `hidden`
    by a policy it is not said how many changed: a withheld one may be the only one that did."""
    told = effect
    if effect and hidden:
        told = {kind: n if kind in ("added", "dropped") else 0 for kind, n in effect.items()}
    said = _did(told) if told else _("not counted")
    if told and hidden and not any(told.values()):
        said = _("none new or dropped")
    return f"{said}; {took}" if took else said


def columns(base: int, effect: Counts | None) -> str:
    """The same for a terminal, with what is counted."""
    if not effect:
        return ""
    if not base:
        return n_(
            "It holds one column of ages.",
            "It holds {count} columns of ages.",
            effect["added"],
            count=whole(effect["added"]),
        )
    return _("Of the columns of ages of edition {base}: {did}.", base=base, did=_did(effect))


def _did(effect: Counts) -> str:
    texts = {
        "added": _("{count} new", count=whole(effect["added"])),
        "changed": _("{count} changed", count=whole(effect["changed"])),
        "restated": _("{count} under another status", count=whole(effect["restated"])),
        "dropped": _("{count} dropped", count=whole(effect["dropped"])),
    }
    parts = [text for kind, text in texts.items() if effect[kind]]
    return names.listed(parts) if parts else _("nothing changed")


def taken(areas: Sequence[str], periods: Sequence[str], gives_way: str) -> str:
    """What of the upload was taken and what gave way, where it is not the usual; else empty."""
    parts = []
    if areas:
        parts.append(_("only {areas}", areas=names.listed(list(areas), most=6)))
    if periods:
        parts.append(_("only {years}", years=names.listed(list(periods), most=6)))
    gave = {
        "handed": _("in place of all of these areas and years"),
        "years": _("in place of all of these years"),
        "areas": _("in place of all of these areas"),
        "all": _("in place of everything"),
    }
    return ", ".join([*parts, *([gave[gives_way]] if gives_way in gave else [])])
