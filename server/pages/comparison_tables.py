"""The tables of a comparison page, from which its pictures and twins are made too."""

from collections.abc import Sequence

import numpy as np

from engine.estimates import Reason
from engine.indicators import GROUPS, find
from engine.settings import span
from engine.standards.remaining_years import REFERENCES
from server.exports.table import Cell, Column, Gap, Row, Table
from server.pages.cells import columns, number, triple, withheld
from server.pages.population_year_tables import about, called, what_it_counts, why_missing
from server.results.compared import Comparison, Side
from server.results.estimating import COMPARED, USUAL
from server.results.loading import Shared
from server.results.questions import PopulationYear
from server.sentences import comparison as say
from server.sentences import names
from server.sentences.text import _

RADIX = 100_000
# why a figure has no interval where the page says so at its head
UNSAID = {"revision": (Reason.NO_SAMPLING_INTERVAL,), "standard": (Reason.A_STANDARD,)}


def named(found: Comparison, side: Side) -> say.Named:
    """A side in words: what is left of a whole, the collection or the edition it stands in where
    the other one stands in another."""
    place = side.place
    if place.standard:
        return say.Named("p", "", "", table=_(REFERENCES[place.standard].label))
    area, brief = place.holdings.name(place.of.area), ""
    if place.rest:
        area, brief = _("the rest of {area}", area=area), _("the rest")
    if found.kind == "elsewhere":
        area = _("{area} ({collection})", area=area, collection=_collection(found, side))
    edition = place.heading.edition.number if found.kind == "revision" else 0
    years = names.years(span(place.of.period, found.settings.years))
    return say.Named(place.of.sex, area, years, edition, brief=brief)


def _collection(found: Comparison, side: Side) -> str:
    """The name of a side's collection, with its code where the other one has the same name."""
    ours, theirs = (one.place.heading.collection for one in (found.this, found.that))
    own = side.place.heading.collection
    return f"{own.name}, {own.code}" if ours.name == theirs.name else own.name


def plain_name(found: Comparison, of: PopulationYear) -> str:
    """A population-year of the edition in words, whatever stands in its place on the page."""
    years = names.years(span(of.period, found.settings.years))
    return say.Named(of.sex, found.holdings.name(of.area), years).whole


def counted_twice(found: Comparison, of: Shared) -> str:
    """Whose deaths are part of both sides."""
    return say.Named(of.sex, found.holdings.name(of.area), names.years(of.periods)).whole


def pair(found: Comparison) -> say.Pair:
    return say.Pair(named(found, found.this), named(found, found.that))


def figures(found: Comparison) -> Table:
    """The few main indicators, and the one asked for, on both sides, and the difference, each with
    its interval."""
    keys = tuple(dict.fromkeys((*USUAL, found.question.of)))
    return _figures(found, "figures", _("The figures of both sides"), keys)


def further(found: Comparison) -> tuple[Table, ...]:
    """All other indicators, a table for each group of the registry."""
    return tuple(
        _figures(found, f"figures-{group.key}", about(group), keys, said=())
        for group in GROUPS
        if (
            keys := [
                one.key for one in group.indicators if one.key in COMPARED and one.key not in USUAL
            ]
        )
    )


def _figures(
    found: Comparison,
    name: str,
    title: str,
    keys: Sequence[str],
    *,
    said: Sequence[Reason] = (Reason.OPEN_GROUP_TOO_LARGE,),
) -> Table:
    both = pair(found)
    heads = (
        Column("indicator", _("Indicator")),
        *columns("this", _head(both.short(both.this), found.this), 1),
        *columns("that", _head(both.short(both.that), found.that), 1),
        *columns("difference", _("difference"), 1, signed=True),
    )
    note = _note(found, both)
    shown = {
        key: [found.this.estimates[key], found.that.estimates[key], found.difference[key]]
        for key in keys
    }
    hushed = (*said, *UNSAID.get(found.kind, ()))
    note = " ".join([note, *why_missing(shown, found.settings, hushed)])
    return Table(name, title, heads, tuple(_figure_row(found, key) for key in keys), note)


def _note(found: Comparison, both: say.Pair) -> str:
    sides = {"this": both.this.whole, "that": both.that.whole}
    level = round(100 * found.settings.level)
    if found.kind == "revision":
        return _(
            "Under the figures of each edition their {level} % intervals, which cover chance in"
            " deaths only. Difference: {this} less {that}, taken before rounding; it is a revision"
            " of the same counts and has no interval.",
            level=level,
            **sides,
        )
    return _(
        "Under each figure its {level} % interval, which covers chance in deaths only."
        " Difference: {this} less {that}, taken before rounding.",
        level=level,
        **sides,
    )


def _head(label: str, side: Side) -> str:
    if side.loaded.status != "provisional":
        return label
    return _("{label}, provisional", label=label)


def _figure_row(found: Comparison, key: str) -> Row:
    indicator = find(key)
    cells: list[Cell] = [key]
    for side in (found.this.estimates[key], found.that.estimates[key], found.difference[key]):
        cells += triple(side, indicator.unit, found.settings)
    return Row(
        tuple(cells),
        second=what_it_counts(key, found.settings, found.grid),
        shown=called(key, found.grid),
        decimals=indicator.unit.decimals,
    )


def gone(found: Comparison, side: Side, age: int) -> bool:
    """Whether the deaths at an age of the grid are withheld on this side."""
    return bool(side.loaded.withheld_on(found.grid)[found.grid.position(age)])


def survivors(found: Comparison) -> Table:
    """Survivors of 100,000 born on both sides, at the starts of the groups."""
    both = pair(found)
    heads = (
        Column("age", _("age"), decimals=0),
        Column("this", both.short(both.this), decimals=0),
        Column("that", both.short(both.that), decimals=0),
        Column("difference", _("difference"), decimals=0, signed=True),
    )
    rows = []
    for age in found.groups.starts:
        at = found.this.table.grid.position(age)
        here, there = (
            np.nan if gone(found, side, age) else RADIX * float(side.table.lx[at])
            for side in (found.this, found.that)
        )
        cells = [number(one) for one in (here, there, here - there)]
        some = any(gone(found, side, age) for side in (found.this, found.that))
        rows.append(Row((age, *(withheld() if some and isinstance(c, Gap) else c for c in cells))))
    return Table("survivors", _("Survivors to each age, of 100,000 born"), heads, tuple(rows))
