"""`ebbline editions`, `withdraw` and `reinstate`: which states there are, and which one stands."""

import argparse
import datetime as dt

from server.accounts.viewer import LOCAL
from server.actions.reinstate_edition import reinstate_edition
from server.actions.withdraw_edition import withdraw_edition
from server.cli.opened import opened
from server.cli.options import Commands, Run, add_command, add_note
from server.cli.tables import add_form, show
from server.config import Config
from server.pages import collections, editions
from server.pages.page import Page
from server.pages.twins import twin
from server.sentences.text import _


def add(commands: Commands) -> None:
    command = add_command(
        commands,
        "editions",
        _list,
        summary=_("list collections, or the editions of one"),
        text=_(
            "Without --collection it lists the collections there are; with it, the editions of "
            "that collection, newest first."
        ),
        examples=("ebbline editions", "ebbline editions --collection quillmere --as json"),
    )
    command.add_argument("--collection", metavar="CODE", help=_("code of one collection"))
    add_form(command)
    _add_verb(
        commands,
        "withdraw",
        _withdraw,
        _("withdraw an edition"),
        _(
            "The edition no longer stands. Its figures can still be read at their addresses, with "
            "the note, and the edition before it stands again."
        ),
        'ebbline withdraw --collection quillmere --edition 2 --note "Wrong file for Tollbay."',
    )
    _add_verb(
        commands,
        "reinstate",
        _reinstate,
        _("let a withdrawn edition stand again"),
        _("The edition stands again; that it was withdrawn stays on record."),
        'ebbline reinstate --collection quillmere --edition 2 --note "It was the right file."',
    )


def _list(asked: argparse.Namespace, config: Config) -> int:
    with opened(config) as session:
        page: Page = (
            editions.build(session, asked.collection)
            if asked.collection
            else collections.build(session)
        )
    show(twin(page), asked.form)
    return 0


def _withdraw(asked: argparse.Namespace, config: Config) -> int:
    with opened(config) as session:
        withdraw_edition(
            session,
            collection=asked.collection,
            number=asked.edition,
            note=asked.note,
            by=LOCAL,
            now=dt.datetime.now(dt.UTC),
        )
    print(_("Edition {number} was withdrawn.", number=asked.edition))
    return 0


def _reinstate(asked: argparse.Namespace, config: Config) -> int:
    with opened(config) as session:
        reinstate_edition(
            session,
            collection=asked.collection,
            number=asked.edition,
            note=asked.note,
            by=LOCAL,
            now=dt.datetime.now(dt.UTC),
        )
    print(_("Edition {number} stands again.", number=asked.edition))
    return 0


def _add_verb(
    commands: Commands, name: str, run: Run, summary: str, text: str, example: str
) -> None:
    command = add_command(commands, name, run, summary=summary, text=text, examples=(example,))
    command.add_argument("--collection", required=True, metavar="CODE", help=_("its code"))
    command.add_argument(
        "--edition", required=True, type=int, metavar=_("NUMBER"), help=_("its number")
    )
    add_note(command)
