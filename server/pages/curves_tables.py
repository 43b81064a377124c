"""The tables of a page of curves, from which its pictures and twins are made too."""

import numpy as np
from numpy.typing import NDArray

from engine.ages import Array
from engine.laws import Fit
from server.exports.table import Cell, Column, Row, Table
from server.pages.cells import columns, count, number, withheld
from server.results.curves import Curves, Related, Single
from server.results.laws import Fitted
from server.sentences import names
from server.sentences.text import _

THOUSAND = 1000


def curves(found: Curves) -> Table:
    """Each closed age group: its rate as counted, off the smooth curves and by the best law."""
    grid, rates = found.panel.grid, found.chain.rates
    heads = (
        Column("age", _("age")),
        Column("deaths", _("deaths"), decimals=0, counted=True),
        Column("counted", _("as counted"), _("per 1,000"), 3),
        *columns("smooth", _("smooth curve"), 3, unit=_("P-spline, per 1,000")),
        Column("graduated", _("graduated"), _("Whittaker-Henderson, per 1,000"), 3),
        Column("law", _law_label(found), _("per 1,000"), 3),
    )
    smooth, graduated, law = _smooth(found), _graduated(found), _law(found)
    rows = tuple(
        Row(
            (
                grid.labels[at],
                withheld() if found.withheld[at] else count(float(found.panel.deaths[at])),
                withheld() if found.withheld[at] else count(THOUSAND * float(rates.mx[at])),
                *(number(THOUSAND * float(part[at]), _not_smooth(found)) for part in smooth),
                number(THOUSAND * float(graduated[at]), _not_graduated(found)),
                number(THOUSAND * float(law[at]), _no_law(found)),
            )
        )
        for at in range(len(grid) - 1)
    )
    note = _("Smooth curves begin at age 10, laws at the ages they were fitted to.")
    title = _("Death rates and curves of {who}", who=_who(found))
    return Table("curves", title, heads, rows, note)


def _who(found: Curves) -> str:
    return names.sex_and_year(found.of.sex, found.period)


def _law_label(found: Curves) -> str:
    best = found.best
    return _("law of {law}", law=_(best.law.label)) if best else _("law")


def _smooth(found: Curves) -> Array:
    """The P-spline and its limits at every closed group, nan beyond its ages: [3, group]."""
    placed = np.full((3, len(found.panel.grid) - 1), np.nan)
    if found.smooth:
        placed[:, found.smooth.groups] = found.smooth.at_groups
    return placed


def _graduated(found: Curves) -> Array:
    placed = np.full(len(found.panel.grid) - 1, np.nan)
    if found.smooth:
        placed[found.smooth.groups] = found.smooth.graduated
    return placed


def _law(found: Curves) -> Array:
    placed = np.full(len(found.panel.grid) - 1, np.nan)
    if found.best:
        placed[len(placed) - found.best.fit.deaths.shape[-1] :] = found.best.fit.rates
    return placed


def _not_smooth(found: Curves) -> str:
    return _("The smooth curve begins at 10.") if found.smooth else _("No curve was fitted.")


def _not_graduated(found: Curves) -> str:
    if found.smooth and np.isnan(found.smooth.graduated).all():
        return _("The age groups from 10 are not equally wide, or too few have deaths.")
    return _not_smooth(found)


def _no_law(found: Curves) -> str:
    best = found.best
    return (
        _("The law was fitted from age {first}.", first=best.first) if best else _("No law fits.")
    )


def residuals(found: Curves) -> Table | None:
    """How far each age group lies from the best law."""
    if found.best is None:
        return None
    fit = found.best.fit
    labels = found.panel.grid.labels[:-1][-fit.deaths.shape[-1] :]
    expected = fit.exposure * fit.rates
    heads = (
        Column("age", _("age")),
        Column("deaths", _("deaths"), decimals=0, counted=True),
        Column("expected", _("expected"), _("by the law"), 1),
        Column("more", _("more deaths"), _("than expected"), 1, signed=True),
        Column("residual", _("distance"), _("deviance residual"), 2, signed=True),
    )
    rows = tuple(
        Row((label, withheld(), float(mean), withheld(), withheld()))
        if gone
        else Row((label, count(float(deaths)), float(mean), float(deaths - mean), float(far)))
        for label, deaths, mean, far, gone in zip(
            labels, fit.deaths, expected, fit.residuals, _of_fit(found, len(labels)), strict=True
        )
    )
    title = _(
        "How far the deaths of {who} lie from the {law}", who=_who(found), law=_law_label(found)
    )
    note = _(
        "Squares of the distances add up to the deviance. By chance alone about one in twenty would"
        " lie beyond 2."
    )
    return Table("residuals", title, heads, rows, note)


def _of_fit(found: Curves, ages: int) -> NDArray[np.bool_]:
    """Which of the closed groups a law was fitted to, the last so many, are withheld."""
    return found.withheld[:-1][-ages:]


def laws(found: Curves) -> Table:
    """Every law that fits: what it says of old age, and how well it describes the death rates."""
    heads = (
        Column("law", _("law")),
        Column("from", _("from age"), decimals=0),
        *columns("mode", _("most deaths"), 1, unit=_("about age")),
        *columns("slope", _("rise"), 1, unit=_("% per year of age")),
        Column("background", _("at any age"), _("per 100,000"), 1),
        Column("deviance", _("deviance"), decimals=1),
        Column("free", _("groups"), _("less parameters"), 0),
        Column("aic", _("AIC"), decimals=1),
    )
    rows = tuple(_law_row(one) for one in found.laws if one.found)
    lost = [_(one.law.label) for one in found.laws if not one.found]
    note = _(
        "A deviance much above the groups less parameters says that the law misses something; of"
        " laws from the same age the one with the lowest AIC describes the rates best."
    )
    if lost:
        note += " " + _("Without a best fit here: {laws}.", laws=names.listed(lost))
    return Table("laws", _("Laws fitted to the death rates"), heads, rows, note)


def _law_row(one: Fitted) -> Row:
    return Row(
        (
            _(one.law.label),
            one.first,
            *(number(part) for part in one.mode),
            *(number(100 * part) for part in one.slope),
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


def single(found: Curves) -> Table | None:
    """Single years of age out of groups, two ways."""
    of = found.single
    if of is None:
        return None
    link, monotone = _("composite link"), _("monotone")
    heads = (
        Column("age", _("age"), decimals=0),
        Column("person_years", _("person-years"), decimals=0),
        *columns("deaths", _("deaths: {way}", way=link), 1),
        Column("deaths_monotone", _("deaths: {way}", way=monotone), decimals=1),
        Column("rate", _("rate: {way}", way=link), _("per 1,000"), 3),
        Column("rate_monotone", _("rate: {way}", way=monotone), _("per 1,000"), 3),
    )
    title = _("Single years of age of {who}, worked out from age groups", who=_who(found))
    note = _(
        "Worked out, not counted. By the composite link sums of groups come near the counts and not"
        " onto them; the interval covers the chance of a death at that age under a smooth curve."
    )
    return Table("single", title, heads, _single_rows(of), note)


def _single_rows(of: Single) -> tuple[Row, ...]:
    parts = (
        *(of.exposure, of.deaths, of.low, of.high, of.interpolated),
        *(THOUSAND * of.rates, THOUSAND * of.rates_interpolated),
    )
    why = _("Nobody died in that age group.")
    return tuple(
        Row((age, *(_or_nil(float(part), why) for part in row)))
        for age, row in enumerate(zip(*parts, strict=True))
    )


def _or_nil(value: float, why: str) -> Cell:
    return count(value) if np.isfinite(value) else number(value, why)


def relation(of: Related | None) -> Table | None:
    """Level and shape against the larger area."""
    if of is None:
        return None
    heads = (Column("number", _("number")), *columns("value", _("against {area}", area=of.area), 3))
    rows = (
        Row(("level", *of.level), shown=_("Level"), second=_("above 0: fewer live on")),
        Row(("shape", *of.shape), shown=_("Shape"), second=_("above 1: a steeper rise with age")),
    )
    note = _("Under each number its interval, which covers chance in the deaths of this area only.")
    return Table("relation", _("Level and shape against {area}", area=of.area), heads, rows, note)
