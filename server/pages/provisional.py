"""How far provisional figures moved before: the caution beside them, and the table of years."""

import math

from server.exports.table import Cell, Column, Gap, GapKind, Row, Table
from server.results.holdings import Holdings
from server.results.provisional import Past, Track, track
from server.sentences import names
from server.sentences import provisional as say
from server.sentences.basis import Told
from server.sentences.text import _
from server.store.connect import Session
from server.store.heading import Heading


def caution(
    session: Session, heading: Heading, held: Holdings, settings: str, figures: str, *, any_: bool
) -> Told:
    """None where nothing that is shown is provisional."""
    if not any_:
        return None
    return say.told(_moves(track(session, heading, settings, figures), held))


def _moves(of: Track, held: Holdings) -> say.Moves | None:
    most, deaths = of.most, of.most_deaths
    if not of:
        return None
    return say.Moves(
        count=len(of.pasts),
        years=len(of.years),
        median=of.median,
        most=abs(most.moved) if most else math.nan,
        who=_who(most, held) if most else "",
        median_deaths=of.median_deaths,
        most_deaths=abs(deaths.deaths) if deaths else math.nan,
    )


def _who(one: Past, held: Holdings) -> str:
    who = names.population(one.of.sex, held.name(one.of.area))
    return _("{who} in {year}", who=who, year=one.of.period)


def table(session: Session, heading: Heading, held: Holdings, settings: str, figures: str) -> Table:
    """One row a year that was provisional once and has been handed in again; without rows where
    there is none."""
    of = track(session, heading, settings, figures)
    return Table(
        "provisional",
        _("How far provisional years moved before"),
        (
            Column("year", _("year")),
            Column("first", _("first in edition")),
            Column("figures", _("figures handed in again"), decimals=0),
            Column("median", _("in the middle"), decimals=2, span=_("life expectancy, years")),
            Column("most", _("at most"), decimals=2, span=_("life expectancy, years")),
            Column("who", _("for"), span=_("life expectancy, years")),
            Column("deaths", _("in the middle"), decimals=1, span=_("deaths, %")),
            Column("most_deaths", _("at most"), decimals=1, span=_("deaths, %")),
        ),
        tuple(_row(year, of.of(year), held) for year in reversed(of.years)),
        _("From the first edition that had the year to this one, under the settings of this page."),
    )


def _row(year: str, of: Track, held: Holdings) -> Row:
    most, deaths = of.most, of.most_deaths
    return Row(
        (
            year,
            str(min(one.first for one in of.pasts)),
            float(len(of.pasts)),
            _number(of.median),
            _number(abs(most.moved) if most else math.nan),
            names.population(most.of.sex, held.name(most.of.area)) if most else "",
            _number(100 * of.median_deaths),
            _number(100 * abs(deaths.deaths) if deaths else math.nan),
        )
    )


def _number(value: float) -> Cell:
    return value if math.isfinite(value) else Gap(GapKind.UNDEFINED)
