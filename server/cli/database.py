"""`ebbline database`: make it, or bring it up to date."""

import argparse

from server.cli.opened import found
from server.cli.options import Commands, add_command
from server.config import Config
from server.sentences.text import _
from server.store.migrating import migrate


def add(commands: Commands) -> None:
    command = add_command(
        commands,
        "database",
        run,
        summary=_("make the database, or bring it up to date"),
        text=_(
            "Makes the database where there is none and brings an older one up to date. No other "
            "command changes its shape, save `ebbline demo`, which calls this one. With --say it "
            "only says what is there."
        ),
        examples=(
            "ebbline database",
            "ebbline database --data /srv/ebbline",
            "ebbline database --say",
        ),
    )
    command.add_argument("--say", action="store_true", help=_("only say what is there"))


def run(asked: argparse.Namespace, config: Config) -> int:
    if not asked.say:
        print(bring_up(config))
        return 0
    state, place = found(config)
    sentences = {
        "head": _("The database at {url} is up to date.", url=place),
        "behind": _("The database at {url} was made by an older version.", url=place),
        "empty": _("There is no database yet at {url}.", url=place),
    }
    print(sentences[state])
    return 0 if state == "head" else 1


def bring_up(config: Config) -> str:
    """Make or migrate; the sentence that says what was done."""
    state, place = found(config)
    if state != "head":
        migrate(config.url)
    return {
        "head": _("The database at {url} is up to date.", url=place),
        "behind": _("The database at {url} was brought up to date.", url=place),
        "empty": _("The database was made at {url}.", url=place),
    }[state]
