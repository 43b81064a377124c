"""What is said of two sides that are not counted alike: in other ages, in another collection or
edition, in a printed table, one part of the other, or what is left of a whole."""

import datetime as dt

from engine.standards.remaining_years import REFERENCES
from server.sentences import names
from server.sentences.dates import day
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _

Told = tuple[str, str]


def two_collections() -> Told:
    return _("Two collections"), _(
        "The deaths of the two collections are taken to be other deaths. Where both count the same"
        " ones, the intervals of the differences are wider than they need be."
    )


def no_rest() -> Told:
    return _("No rest"), _(
        "The rest of the larger area cannot be taken: at some ages it counts fewer deaths or people"
        " than its part does. The two are compared as they are, and deaths in both count once."
    )


def printed_table(key: str) -> Told:
    """Where the rates of a printed table come from, and what they can bear."""
    return _("Printed table"), _(
        "The {table} prints the years still to live at each age, for both sexes alike; the death"
        " rates that give them are worked out. Printed to a hundredth of a year, they leave the"
        " rates of children and young adults too coarse for a ratio. It has no chance of its own,"
        " and nobody need have reached it. Source: {source}.",
        table=_(REFERENCES[key].label),
        source=REFERENCES[key].source,
    )


def rest(whole: str, part: str) -> Sentence:
    """What the rest is."""
    return phrase(
        _("The rest of {whole} is {whole} without {part}, count for count."), whole=whole, part=part
    )


def other_withdrawn(collection: str, number: int, when: dt.date, note: str) -> Sentence:
    """Of the edition that the other side stands in."""
    return phrase(
        _(
            "Edition {number} of {collection}, in which the other side stands, was withdrawn on"
            " {day}. {note}"
        ),
        number=str(number),
        collection=collection,
        day=day(when),
        note=note,
    )


def other_superseded(collection: str, number: int, newer: Piece) -> Sentence:
    return phrase(
        _(
            "The other side stands in edition {number} of {collection}, and this page will go on"
            " showing it. {newer} stands there now."
        ),
        number=str(number),
        collection=collection,
        newer=newer,
    )


def regrouped(sides: list[str], ages: str, open_age: int) -> tuple[str, str]:
    return _("Age groups"), _(
        "The two were counted in different age groups. Both are read on those they share ({ages},"
        " open at {open_age}); regrouped for it: {sides}.",
        ages=ages,
        open_age=open_age,
        sides=names.listed(sides),
    )


def counted_twice(which: str) -> tuple[str, str]:
    return _("Counted in both"), _(
        "The deaths of {which} are part of both sides. The intervals of the differences and of the"
        " ages’ contributions count them once.",
        which=which,
    )
