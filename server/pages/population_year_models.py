"""Parts of a population-year page: another population at the highest ages, fewer deaths, and why a
figure reads differently than before."""

from engine.estimates import Estimate
from engine.indicators import find
from server.exports.table import Column, Gap, Row, Table
from server.pages.cells import columns, count, number, triple, withheld
from server.results.account import AccountQuestion
from server.results.models import MOVED
from server.results.population_year import Findings
from server.results.questions import address
from server.sentences import models as say
from server.sentences import names
from server.sentences.pieces import Piece, Sentence
from server.sentences.text import _


def implied(found: Findings) -> Table | None:
    """The population at the open age that the deaths imply, and what it would make of figures."""
    of = found.implied
    if of is None or not of.known:
        return None
    heads = (
        Column("figure", _("figure")),
        *columns("as_counted", _("as counted"), 1),
        *columns("as_implied", _("as implied"), 1),
    )
    rows = [_implied_row(found, key, of.figures[key]) for key in MOVED]
    title = _(
        "What the population at {age} and over that the deaths imply would make of figures",
        age=of.population.age,
    )
    note = _("The interval of a figure as implied covers the chance of the ratio only.")
    return Table("implied", title, heads, tuple(rows), note)


def _implied_row(found: Findings, key: str, implied: Estimate) -> Row:
    one = find(key)
    sides = (found.estimates[key], implied)
    cells = (cell for side in sides for cell in triple(side, one.unit, found.settings))
    return Row((key, *cells), shown=_(one.label), decimals=one.unit.decimals)


def avoidable(found: Findings) -> Table:
    """Deaths fewer at each age alone for a month of life expectancy, beside those there are."""
    of, grid = found.avoidable, found.loaded.panel.grid
    out_of_reach = say.out_of_reach()
    rows = tuple(
        Row(
            (label, withheld(), withheld())
            if gone
            else (label, count(float(there)), number(float(fewer), out_of_reach))
        )
        for label, there, fewer, gone in zip(
            grid.labels, of.there, of.deaths, found.withheld, strict=True
        )
    )
    heads = (
        Column("age", _("age")),
        Column("there", _("deaths there were"), decimals=0, counted=True),
        Column("avoid", _("deaths fewer for one month"), decimals=1),
    )
    title = _(
        "Deaths fewer at one age that make life expectancy of {who} a month longer",
        who=names.sex_and_year(found.of.sex, found.period),
    )
    note = say.exchange()
    if any(
        isinstance(cell, Gap) and cell.reason == out_of_reach for row in rows for cell in row.cells
    ):
        note += " " + _("Where there is no number, not even all deaths of that age make a month.")
    return Table("avoid", title, heads, rows, note)


def why(found: Findings) -> tuple[Sentence, ...]:
    """Why life expectancy reads differently than in the edition this one was built on."""
    heading, asked = found.heading, found.question
    base = heading.edition.base
    if not base:
        return ()
    question = AccountQuestion(found.of, base, "e0", asked.figures, asked.settings, asked.settings)
    place = address(heading.collection.code, heading.edition.number, question)
    words = _("Does this read differently than in edition {number}, and why?", number=base)
    return ((Piece(words, place),),)
