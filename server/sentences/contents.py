"""What is said of an edition as a whole: its span, its newest figures, its standing."""

import datetime as dt
import math
from collections.abc import Sequence

from engine.estimates import Estimate
from engine.indicators import INDICATORS
from server.sentences import names
from server.sentences.curves import question as behind_the_rates
from server.sentences.dates import day
from server.sentences.movements import shown
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _, n_


def answer(collection: str, number: int, periods: Sequence[str], areas: int) -> Sentence:
    """What the edition holds, in one line."""
    if not periods:
        return phrase(
            _("{collection}, edition {number}, holds nothing."),
            collection=collection,
            number=str(number),
        )
    return phrase(
        _("{collection}, edition {number}: {holds}."),
        collection=collection,
        number=str(number),
        holds=holds(periods, areas),
    )


def holds(periods: Sequence[str], areas: int) -> str:
    """25 years, 1999 to 2023, 7 areas."""
    if not periods:
        return _("nothing")
    return _("{span}, {areas}", span=span(periods), areas=n_("one area", "{count} areas", areas))


def span(periods: Sequence[str]) -> str:
    """25 years, 1999 to 2023; the one year 2023."""
    if len(periods) == 1:
        return _("the one year {year}", year=periods[0])
    return _(
        "{count} years, {first} to {last}", count=len(periods), first=periods[0], last=periods[-1]
    )


def newest(
    area: str, period: str, by_sex: Sequence[tuple[str, Estimate]], *, provisional: bool
) -> Sentence:
    """Life expectancy of the first area in its newest year; empty where there is none."""
    unit = INDICATORS["e0"].unit
    known = [(sex, one) for sex, one in by_sex if math.isfinite(float(one.value))]
    if not known:
        return ()
    parts = [
        _("{value}\N{NO-BREAK SPACE}years for {sex}", value=shown(one, unit), sex=names.sex(sex))
        for sex, one in known
    ]
    text = (
        _("In {year} life expectancy at birth in {area} was {parts} (provisional).")
        if provisional
        else _("In {year} life expectancy at birth in {area} was {parts}.")
    )
    return phrase(
        text,
        year=period,
        area=area,
        parts=names.listed(parts),
    )


def superseded(shown_: int, newer: Piece) -> Sentence:
    """A newer edition stands."""
    return phrase(
        _("This page shows edition {shown} and will go on showing it. {newer} stands now."),
        shown=str(shown_),
        newer=newer,
    )


def erased(when_and_why: str) -> Sentence:
    """The bytes an edition was made of are gone; its figures are not."""
    return phrase(
        _(
            "The files this edition was made of were erased {how} The figures stay; their digests "
            "are on record, but the edition can no longer be made anew."
        ),
        how=when_and_why if when_and_why.endswith((".", "!", "?")) else f"{when_and_why}.",
    )


def editions(collection: str, count: int, standing_: int | None) -> Sentence:
    """How many there are and which one stands."""
    if not count:
        return phrase(_("{collection} has no edition yet."), collection=collection)
    if standing_ is None:
        text = (
            _("{collection} has one edition, and it was withdrawn.")
            if count == 1
            else _("{collection} has {count} editions, and all of them were withdrawn.")
        )
    else:
        text = (
            _("{collection} has one edition, and it stands.")
            if count == 1
            else _("{collection} has {count} editions; edition {number} stands.")
        )
    return phrase(text, collection=collection, count=str(count), number=str(standing_))


def standing(*, stands: bool, withdrawn: dt.date | None) -> str:
    """Stands, superseded or withdrawn (and when); in the table of editions."""
    if withdrawn is not None:
        return _("withdrawn {day}", day=day(withdrawn))
    return _("stands") if stands else _("superseded")


def quality(place: str) -> Sentence:
    """Where the counts themselves are judged."""
    return phrase(
        _("{question} What is there, what the checks find in it, and what its owner states."),
        question=Piece(_("How good are these counts?"), place),
    )


def questions(
    *,
    population: str,
    comparison: str,
    trend: str,
    curves: str,
    changes: tuple[int, str] | None,
    who: str,
    area: str,
    this: str,
    that: str,
) -> tuple[Sentence, ...]:
    """What may be asked next, each with the address of a first answer. `changes`: the edition this
    one was built on, and the address of what it changed."""
    revision = (
        (
            phrase(
                _("{question} Against edition {number}, on which it was built."),
                question=Piece(_("What did this edition change?"), changes[1]),
                number=str(changes[0]),
            ),
        )
        if changes
        else ()
    )
    return (
        phrase(
            _("{question} For example {who} in {year}."),
            question=Piece(_("How long do people live here?"), population),
            who=who,
            year=this,
        ),
        phrase(
            _("{question} For example {who} in {year} and in {before}."),
            question=Piece(_("What lies between these two?"), comparison),
            who=who,
            year=this,
            before=that,
        ),
        phrase(
            _("{question} For example life expectancy at birth in {area}, all years."),
            question=Piece(_("Which way is it going?"), trend),
            area=area,
        ),
        phrase(
            _("{question} For example those of {who} in {year}."),
            question=Piece(behind_the_rates(), curves),
            who=who,
            year=this,
        ),
        *revision,
    )


def causes(place: str, who: str, year: str) -> Sentence:
    """Where deaths by cause are told, beside the other questions."""
    return phrase(
        _("{question} For example {who} in {year}."),
        question=Piece(_("Of what do people die here?"), place),
        who=who,
        year=year,
    )


def cause_list(count: int) -> str:
    """Over the fold with the list."""
    return n_("The one cause of its list", "The {count} causes of its list", count)


def cause_kind(key: str) -> str:
    """What sort of deaths a cause gathers, in the table of the list."""
    return {
        "natural": _("natural"),
        "external": _("external: accident, violence, poisoning"),
        "undetermined": _("intent not determined"),
        "ill_defined": _("ill-defined"),
        "pending": _("may still be given a cause"),
        "not_underlying": _("not an underlying cause"),
    }[key]


def withdrawing() -> str:
    return _(
        "Withdrawing takes nothing away: the figures can still be read at their addresses, with a "
        "notice. If this is the edition that stands, the newest before it stands again."
    )


def reinstating() -> str:
    return _("Reinstating lets the edition stand again; that it was withdrawn stays on record.")
