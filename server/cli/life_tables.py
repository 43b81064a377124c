"""`ebbline life-tables`: every life table of an edition in one file."""

import argparse
import sys
from collections.abc import Iterator
from pathlib import Path

from engine.settings import SETTINGS
from server.cli.opened import opened
from server.cli.options import Commands, add_command
from server.config import Config
from server.exports import csv
from server.exports.table import Column, Row, Table
from server.pages.cells import number, withheld
from server.results.all_tables import Made, all_tables
from server.results.questions import DEFAULT_SETTINGS
from server.routes.asking import newest
from server.sentences.text import _, n_
from server.store.heading import heading

COLUMNS = ("mx", "ax", "qx", "lx", "dx", "Lx", "Tx", "ex")
DECIMALS = 6


def add(commands: Commands) -> None:
    command = add_command(
        commands,
        "life-tables",
        run,
        summary=_("write every life table of an edition as CSV"),
        text=_(
            "Writes one row for each area, sex, year and age, births taken as 1: the numbers of "
            "the population-year pages before rounding. Where life expectancy may not be given, "
            "the table is left out and counted. A job over a whole collection: it works in "
            "compiled code where numba is installed."
        ),
        examples=(
            "ebbline life-tables --collection quillmere --to tables.csv",
            "ebbline life-tables --collection quillmere --edition 1 --settings almanac-1-kannisto",
        ),
    )
    command.add_argument("--collection", required=True, metavar="CODE", help=_("its code"))
    command.add_argument("--edition", type=int, metavar=_("NUMBER"), help=_("its number"))
    command.add_argument("--settings", choices=tuple(SETTINGS), default=DEFAULT_SETTINGS)
    command.add_argument("--to", metavar=_("FILE"), help=_("file to write; otherwise the terminal"))


def run(asked: argparse.Namespace, config: Config) -> int:
    with opened(config) as session:
        given = asked.edition
        edition = newest(session, asked.collection) if given is None else given
        known = heading(session, asked.collection, edition)
        found = list(all_tables(session, asked.collection, known.edition.number, asked.settings))
    table = Table("life-tables", _("Life tables"), _heads(), tuple(_rows(found)))
    content = csv.write(table)
    if asked.to:
        Path(asked.to).write_bytes(content)
    else:
        print(content.decode().replace("\r\n", "\n"), end="")
    print(_told(found), file=sys.stderr)
    return 0


def _told(found: list[Made]) -> str:
    written = sum(sum(made.readable) for made in found)
    left_out = sum(len(made.of) for made in found) - written
    return _(
        "{written}, {left_out} ({version})",
        written=n_("one life table", "{count} life tables", written, count=written),
        left_out=n_("one left out", "{count} left out", left_out, count=left_out),
        version=", ".join(dict.fromkeys(made.version for made in found)),
    )


def _heads() -> tuple[Column, ...]:
    return (
        Column("area", _("area")),
        Column("sex", _("sex")),
        Column("year", _("year")),
        Column("status", _("status")),
        Column("age", _("age")),
        *(Column(name, name, decimals=DECIMALS) for name in COLUMNS),
    )


def _rows(found: list[Made]) -> Iterator[Row]:
    for made in found:
        for at, one in enumerate(made.of):
            if not made.readable[at]:
                continue
            for x, age in enumerate(made.table.grid.labels):
                values = (float(getattr(made.table, name)[at, x]) for name in COLUMNS)
                if made.protected[at]:
                    values = (round(value, DECIMALS) for value in values)
                gone = made.withheld[at, x]
                shown = (withheld() if gone else number(value) for value in values)
                yield Row((one.area, one.sex, one.period, made.status[at], age, *shown))
