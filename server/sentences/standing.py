"""What is said of an edition on the pages pinned to it."""

import datetime as dt
import math
from dataclasses import dataclass

from engine.indicators import Unit
from server.sentences.dates import day
from server.sentences.numbers import as_printed, number
from server.sentences.pieces import Piece, Sentence, phrase
from server.sentences.text import _


@dataclass(frozen=True, slots=True)
class Headline:
    """The figure a page is about, here and in the newest edition; nan where one cannot give it."""

    label: str  # at the head of a sentence
    unit: Unit
    here: float
    there: float


def superseded(shown: int, newer: Piece, headline: Headline) -> Sentence:
    """A newer edition stands. By how much it moves the headline is exact, no matter of chance."""
    stays = _("This page shows edition {shown} and will go on showing it.", shown=shown)
    if not (math.isfinite(headline.here) and math.isfinite(headline.there)):
        return phrase(
            _("{stays} {newer} has no figure to set beside this one."), stays=stays, newer=newer
        )
    unit = headline.unit
    both = [unit.scale * value for value in (headline.here, headline.there)]
    # what a revision moves is small; figures given to fixed decimals have no more of them
    fixed = all(as_printed(value, unit.decimals) == round(value, 9) for value in both)
    decimals = unit.decimals if fixed else unit.decimals + 1
    here, there = (as_printed(value, decimals) for value in both)
    moved = number(abs(there - here), decimals)
    values: dict[str, Piece | str] = {
        "stays": stays,
        "newer": newer,
        "label": headline.label,
        "here": number(here, decimals),
        "there": number(there, decimals),
    }
    if moved == number(0, decimals):
        return phrase(_("{stays} {newer} gives the same here ({label}: {there})."), **values)
    text = (
        _("{stays} {newer} gives {moved} more here. {label}: {there} there, {here} on this page.")
        if there > here
        else _(
            "{stays} {newer} gives {moved} less here. {label}: {there} there, {here} on this page."
        )
    )
    return phrase(text, moved=moved, **values)


def withdrawn(number: int, when: dt.date, note: str, instead: Piece | None) -> Sentence:
    """The edition no longer stands; what it said can still be read. `instead` is the one that
    stands, if one does."""
    text = (
        _(
            "Edition {number} was withdrawn on {day}: {note} Its figures can still be read here,"
            " so that what was said of them can be followed."
        )
        if note.strip()
        else _(
            "Edition {number} was withdrawn on {day}. Its figures can still be read here, so that"
            " what was said of them can be followed."
        )
    )
    said = phrase(text, number=str(number), day=day(when), note=_ended(note))
    now = (
        phrase(_("{edition} stands now."), edition=instead)
        if instead
        else phrase(_("No edition stands now."))
    )
    return (*said, Piece(" "), *now)


def _ended(note: str) -> str:
    note = note.strip()
    return note if note.endswith((".", "!", "?")) else f"{note}."


def basis_people(people: str) -> str:
    return {
        "residents": _("Deaths of residents, wherever they died"),
        "occurrences": _("Deaths that occurred in the area, whoever died"),
    }[people]


def basis_dated(dated_by: str) -> str:
    return {"death": _("by date of death"), "registration": _("by date of registration")}[dated_by]


def basis_population(population: str) -> str:
    return {
        "midyear": _("the population in the middle of the year stands for the person-years"),
        "person_years": _("person-years as delivered"),
        "january": _("person-years are the mean of the populations of two 1 Januaries"),
    }[population]
