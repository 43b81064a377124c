"""Tables of a population-year page that rest on fitted laws, and on fewer deaths."""

import numpy as np

from engine.estimates import Estimate
from engine.indicators import find
from engine.laws import Fit
from server.exports.table import Cell, Column, Gap, Row, Table
from server.pages.cells import columns, count, number, triple
from server.results.models import MOVED, Fitted
from server.results.population_year import Findings
from server.sentences import models as say
from server.sentences import names
from server.sentences.text import _


def laws(found: Findings) -> Table:
    """Every law that fits: what it says of old age, and how well it describes the death rates."""
    heads = (
        Column("law", _("law")),
        Column("from", _("from age"), decimals=0),
        *columns("mode", _("age of most deaths"), 1),
        *columns("slope", _("rise"), 1, unit=_("% per year of age")),
        Column("background", _("at all ages alike"), _("per 100,000"), 1),
        Column("deviance", _("deviance"), decimals=1),
        Column("free", _("age groups"), _("less parameters"), 0),
        Column("aic", _("AIC"), decimals=1),
    )
    rows = tuple(_law(one) for one in found.laws if one.found)
    note = _(
        "Fitted to the closed age groups by Poisson likelihood. A deviance much above the groups"
        " less parameters says that the law misses something; of laws from the same age the one"
        " with the lowest AIC describes the rates best."
    )
    return Table("laws", _("Laws fitted to the death rates"), heads, rows, note)


def _law(one: Fitted) -> Row:
    return Row(
        (
            _(one.law.label),
            one.first,
            *(number(float(part)) for part in one.mode),
            *(number(100 * float(part)) for part in one.slope),
            _background(one.fit),
            number(float(one.fit.deviance)),
            one.free,
            number(float(one.fit.aic)),
        )
    )


def _background(fit: Fit) -> Cell:
    if "background" not in fit.law.names:
        return number(np.nan, _("This law has no such part."))
    return count(100_000 * float(np.exp(fit.parameters[fit.law.position("background")])))


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
        Row((label, count(float(there)), number(float(fewer), out_of_reach)))
        for label, there, fewer in zip(grid.labels, of.there, of.deaths, strict=True)
    )
    heads = (
        Column("age", _("age")),
        Column("there", _("deaths there were"), decimals=0),
        Column("avoid", _("deaths fewer for one month"), decimals=1),
    )
    title = _(
        "Deaths fewer at one age that make life expectancy of {who} a month longer",
        who=names.sex_and_year(found.of.sex, found.period),
    )
    note = say.exchange()
    if any(isinstance(cell, Gap) and cell.reason for row in rows for cell in row.cells):
        note += " " + _("Where there is no number, not even all deaths of that age make a month.")
    return Table("avoid", title, heads, rows, note)
