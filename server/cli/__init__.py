"""The same actions from a terminal: `ebbline demo`, `ebbline hand-in`, `ebbline figure` ..."""

import argparse
import os
import sys
from collections.abc import Sequence
from contextlib import ExitStack
from dataclasses import replace
from pathlib import Path

from server.cli import (
    database,
    demo,
    editions,
    erase,
    figure,
    hand_in,
    life_tables,
    policy,
    rebuild,
    reproduce,
    serve,
)
from server.cli.refusals import REFUSALS, exit_code, sentence
from server.config import Config
from server.sentences.text import _, speaking

COMMANDS = (
    demo,
    serve,
    database,
    hand_in,
    figure,
    life_tables,
    editions,
    policy,
    rebuild,
    reproduce,
    erase,
)


def parser() -> argparse.ArgumentParser:
    """All commands; each is a module with `add(commands)`, or several kin in one."""
    top = argparse.ArgumentParser(
        prog="ebbline",
        description=_(
            "An almanac of mortality: from counts of deaths and people to life tables, comparisons "
            "and trends, with an address for every figure."
        ),
        epilog=_(
            "Begin with `ebbline demo`. `ebbline COMMAND --help` explains a command with examples."
        ),
    )
    commands = top.add_subparsers(title=_("commands"), metavar="COMMAND", required=True)
    for command in COMMANDS:
        command.add(commands)
    return top


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command; 0 where it did what was asked, else a sentence and another number."""
    with ExitStack() as language:
        try:
            config = Config.from_environment()
            language.enter_context(speaking(config.language))
        except ValueError as error:
            print(f"ebbline: {error}", file=sys.stderr)
            return 2
        asked = parser().parse_args(arguments)
        try:
            code = int(asked.run(asked, _with_options(config, asked)))
            sys.stdout.flush()
        except REFUSALS as error:
            print(f"ebbline: {sentence(error)}", file=sys.stderr)
            return exit_code(error)
        except KeyboardInterrupt:
            return 130
        except BrokenPipeError:  # who read along wanted no more: `ebbline figure ... | head`
            os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
            return 141
        return code


def _with_options(config: Config, asked: argparse.Namespace) -> Config:
    """What was given by hand goes before the environment; a data folder before any database."""
    if getattr(asked, "data", None) is not None:
        config = replace(config, data=Path(asked.data), database_url="")
    if getattr(asked, "port", None) is not None:
        config = replace(config, port=asked.port)
    return config
