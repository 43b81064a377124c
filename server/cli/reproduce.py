"""`ebbline reproduce`: every figure of a printed table matched or explained."""

import argparse
from pathlib import Path

from engine.settings import SETTINGS
from server.cli.opened import opened
from server.cli.options import Commands, add_command
from server.cli.refusals import Declined
from server.cli.tables import add_form, show
from server.config import Config
from server.pages import reproduce
from server.pages.reproduce import Asked
from server.pages.twins import twin
from server.sentences.pieces import plain
from server.sentences.text import _


def add(commands: Commands) -> None:
    command = add_command(
        commands,
        "reproduce",
        run,
        summary=_("look up a table that was printed before"),
        text=_(
            "Reads a file that was saved from a page (CSV, XLSX or JSON), or a table with the "
            "columns area, sex, year, indicator and value, and says of every figure whether it is "
            "matched, and if not, why. It ends with code 1 where a figure is not found or a row is "
            "not known. Nothing is kept."
        ),
        examples=(
            "ebbline reproduce last-year.csv --collection quillmere --edition 1",
            "ebbline reproduce quillmere-2-trend.xlsx --as json",
        ),
    )
    command.add_argument("file", type=Path, metavar=_("FILE"), help=_("the printed table"))
    command.add_argument("--collection", default="", metavar="CODE", help=_("its code"))
    command.add_argument("--edition", default="", metavar=_("NUMBER"), help=_("its number"))
    command.add_argument("--settings", default="", choices=("", *SETTINGS))
    command.add_argument("--indicator", default="", metavar=_("KEY"), help=_("of every row"))
    command.add_argument(
        "--address", default="", metavar=_("ADDRESS"), help=_("of the page it was saved from")
    )
    add_form(command)


def run(asked: argparse.Namespace, config: Config) -> int:
    try:
        content = asked.file.read_bytes()
    except OSError as error:
        raise Declined(
            _("{file} cannot be read: {why}.", file=asked.file, why=error.strerror)
        ) from error
    given = Asked(asked.collection, asked.edition, asked.settings, asked.indicator, asked.address)
    with opened(config) as session:
        page = reproduce.build(session, asked.file.name, content, given, most=None)
    if asked.form == "table":
        print(plain(page.answer))
    if page.tables:
        show(twin(page), asked.form)
    wrong = {_("not found"), _("not known")}
    cells = {cell for table in page.tables for row in table.rows for cell in row.cells}
    return 1 if page.unknown or wrong & cells else 0
