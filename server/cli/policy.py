"""`ebbline policy`: what of small counts a collection shows, and setting it."""

import argparse
import datetime as dt

from server.accounts.viewer import LOCAL
from server.actions.set_policy import effect_of, set_policy
from server.cli.opened import opened
from server.cli.options import Commands, add_command
from server.cli.tables import add_form, show
from server.config import Config
from server.disclosure.rounding import BASES
from server.pages import policy
from server.pages.policy import Trial
from server.pages.twins import twin
from server.sentences.pieces import plain
from server.sentences.text import _
from server.store import policies
from server.store.records import Terms


def add(commands: Commands) -> None:
    command = add_command(
        commands,
        "policy",
        run,
        summary=_("say what small counts a collection withholds, or set it"),
        text=_(
            "Without --note it says what is withheld, or, with other terms, what would be; with "
            "--note it sets them, and every edition gets its mask anew."
        ),
        examples=(
            "ebbline policy --collection quillmere",
            "ebbline policy --collection quillmere --threshold 3",
            "ebbline policy --collection quillmere --base 5",
            'ebbline policy --collection quillmere --threshold 5 --note "As the office decided."',
        ),
    )
    command.add_argument("--collection", required=True, metavar="CODE", help=_("its code"))
    command.add_argument("--threshold", type=int, help=_("fewest deaths that are shown"))
    command.add_argument("--persons", type=int, help=_("fewest people whose deaths are shown"))
    command.add_argument(
        "--coarse-below", type=int, help=_("areas of fewer people are given by five-year ages")
    )
    command.add_argument("--zeros", choices=("shown", "withheld"), help=_("whether nil is shown"))
    command.add_argument(
        "--base",
        type=int,
        choices=(0, *BASES),
        help=_("round all counts to multiples of it instead of withholding; 0: withhold"),
    )
    command.add_argument(
        "--causes", choices=("whole", "none"), help=_("whose deaths by cause are shown")
    )
    command.add_argument("--note", default="", help=_("why, in a sentence: sets the policy"))
    add_form(command)


def run(asked: argparse.Namespace, config: Config) -> int:
    names = ("threshold", "persons", "coarse_below", "zeros", "base", "causes")
    given = {name: getattr(asked, name) for name in names if getattr(asked, name) is not None}
    with opened(config) as session:
        newest = policies.newest(session, asked.collection)
        terms = Terms(**given) if given else newest.terms if newest else Terms()
        trial = None
        if asked.note:
            set_policy(
                session,
                collection=asked.collection,
                terms=terms,
                note=asked.note,
                by=LOCAL,
                now=dt.datetime.now(dt.UTC),
            )
        elif given:
            trial = Trial(terms, effect_of(session, asked.collection, terms))
        page = policy.build(session, asked.collection, trial)
    if asked.form == "table":
        print(plain(page.answer))
    show(twin(page), asked.form)
    return 0
