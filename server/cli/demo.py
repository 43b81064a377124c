"""`ebbline demo`: from nothing to the demonstration collection in a browser."""

import argparse
import datetime as dt

from seed_scenarios import demonstration
from server.cli.database import bring_up
from server.cli.opened import opened
from server.cli.options import Commands, add_command, add_port
from server.cli.serve import require_port, serve
from server.config import Config
from server.sentences.text import _
from server.store import collections


def add(commands: Commands) -> None:
    command = add_command(
        commands,
        "demo",
        run,
        summary=_("load the demonstration collection and serve the pages"),
        text=_(
            "Makes the database where there is none, loads the demonstration collection through "
            "the same steps as anybody's upload, and serves the pages on this computer. A second "
            "run keeps what is there."
        ),
        examples=("ebbline demo", "ebbline demo --port 8010", "ebbline demo --data /tmp/trial"),
    )
    add_port(command)
    command.add_argument(
        "--load-only", action="store_true", help=_("load the collection and do not serve")
    )


def run(asked: argparse.Namespace, config: Config) -> int:
    if not asked.load_only:
        require_port(config)
    print(bring_up(config))
    with opened(config) as session:
        there = [one.code for one in collections.all_collections(session)]
        if demonstration.lacking(there):
            print(_("Loading the demonstration collection (a few seconds) ..."), flush=True)
            demonstration.build(session, now=dt.datetime.now(dt.UTC), there=there)
        else:
            print(_("The demonstration collection is there already; nothing was changed."))
    return 0 if asked.load_only else serve(config)
