"""`ebbline figure`: any indicator for areas, sexes and years."""

import argparse
import sys

from engine.panel import SEXES
from engine.settings import SETTINGS
from server.cli.opened import opened
from server.cli.options import Commands, add_command
from server.cli.tables import add_form, show
from server.config import Config
from server.exports.table import Column, Row, Table
from server.exports.twin import Twin
from server.pages import cells, frames, trend_tables
from server.results.holdings import Holdings, holdings
from server.results.questions import DEFAULT_SETTINGS, TrendQuestion, address
from server.results.series import Series, series
from server.routes.asking import newest
from server.sentences.pieces import plain
from server.sentences.text import _
from server.store.heading import Heading, heading


def add(commands: Commands) -> None:
    command = add_command(
        commands,
        "figure",
        run,
        summary=_("print indicators for areas, sexes and years"),
        text=_(
            "Prints figures with their intervals, the same numbers as the pages show. Without "
            "--area it takes the whole, without --sex women and men, without --from and --to all "
            "years, without --edition the newest that stands. INDICATOR is a key of the methods "
            "page, such as e0, edagger, H, smr or imr. Its ages may be others: e80, l70, 30q40, "
            "yll70, e20_60; asr_by_ with area, sex and year weighs by the ages of those people."
        ),
        examples=(
            "ebbline figure e0 --collection quillmere",
            "ebbline figure e0 H --collection quillmere --area tollbay --sex m --from 2005",
            "ebbline figure asr_esp2013 --collection quillmere --settings almanac-1-3-years",
            "ebbline figure e65 --collection quillmere --from 2023 --as csv",
        ),
    )
    command.add_argument(
        "indicator", nargs="+", metavar=_("INDICATOR"), help=_("key of an indicator")
    )
    command.add_argument("--collection", required=True, metavar="CODE", help=_("its code"))
    command.add_argument("--edition", type=int, metavar=_("NUMBER"), help=_("its number"))
    command.add_argument("--area", action="append", metavar="CODE", help=_("may be repeated"))
    command.add_argument("--sex", action="append", choices=SEXES, help=_("may be repeated"))
    command.add_argument("--from", dest="first", metavar=_("YEAR"), help=_("first year"))
    command.add_argument("--to", dest="last", metavar=_("YEAR"), help=_("last year"))
    command.add_argument("--settings", choices=tuple(SETTINGS), default=DEFAULT_SETTINGS)
    add_form(command)


def run(asked: argparse.Namespace, config: Config) -> int:
    with opened(config) as session:
        number = newest(session, asked.collection) if asked.edition is None else asked.edition
        known = heading(session, asked.collection, number).released
        held = holdings(session, asked.collection, number)
        found = [series(session, known, _question(asked, key, held)) for key in asked.indicator]
    told = _twin(known, found)
    for word, text in told.notices:
        print(f"{word}. {text}", file=sys.stderr)
    show(told, asked.form)
    return 0


def _question(asked: argparse.Namespace, key: str, held: Holdings) -> TrendQuestion:
    """Through the same reading of keys as an address."""
    items: list[tuple[str, str]] = [("of", key), ("settings", asked.settings)]
    items += [("area", area) for area in asked.area or ()]
    items += [("sex", sex) for sex in asked.sex or ()]
    items += [(name, year) for name, year in (("from", asked.first), ("to", asked.last)) if year]
    return TrendQuestion.parse(items).completed(
        areas=[area.code for area in held.areas], sexes=held.sexes, periods=held.periods
    )


def _twin(known: Heading, found: list[Series]) -> Twin:
    collection, edition = known.collection, known.edition
    table = Table(
        "figures",
        _("Figures"),
        (
            Column("indicator", _("indicator")),
            Column("area", _("area")),
            Column("sex", _("sex")),
            Column("year", _("year")),
            *cells.columns("value", _("value"), 1),
            Column("unit", _("unit")),
        ),
        tuple(row for one in found for row in _rows(one)),
    )
    return Twin(
        title=_(
            "Figures of {collection}, edition {number}",
            collection=collection.name,
            number=edition.number,
        ),
        address=" ".join(address(collection.code, edition.number, one.question) for one in found),
        about=((_("Settings"), found[0].settings.key), (_("Content"), edition.digest)),
        notices=tuple(
            (notice.word, plain(notice.text))
            for notice in frames.notices(known, found[0].question, None, None)
        ),
        cautions=(),
        tables=(table,),
    )


def _marks(found: Series, line: int, at: int) -> tuple[str, ...]:
    own = trend_tables.mark(found, line, at)
    return ("", "", "", "", own, own, own, "")


def _rows(found: Series) -> list[Row]:
    unit = found.indicator.unit
    return [
        Row(
            (
                found.indicator.key,
                area,
                sex,
                period,
                *cells.triple(found.estimate[line, at], unit, found.settings),
                _(unit.label),
            ),
            provisional=found.status[line][at] == "provisional",
            marks=_marks(found, line, at),
            decimals=unit.decimals,
        )
        for line, (area, sex) in enumerate(found.lines)
        for at, period in enumerate(found.periods)
    ]
