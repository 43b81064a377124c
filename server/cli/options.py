"""How every command is added, and the options that several share."""

import argparse
from collections.abc import Callable, Sequence
from typing import TypeAlias

from server.config import Config
from server.sentences.text import _

Commands: TypeAlias = "argparse._SubParsersAction[argparse.ArgumentParser]"
Run = Callable[[argparse.Namespace, Config], int]


def add_command(
    commands: Commands, name: str, run: Run, *, summary: str, text: str, examples: Sequence[str]
) -> argparse.ArgumentParser:
    """A command with its help: what it does, how it is called, and --data."""
    lines = "\n".join(f"  {example}" for example in examples)
    command = commands.add_parser(
        name,
        help=summary,
        description=text,
        epilog=_("examples:") + "\n" + lines,
        formatter_class=_Help,
    )
    command.add_argument(
        "--data",
        metavar=_("FOLDER"),
        help=_("folder in which the database lives (or EBBLINE_DATA; otherwise ./data)"),
    )
    command.set_defaults(run=run)
    return command


class _Help(argparse.RawDescriptionHelpFormatter):
    """Wraps the description and keeps the lines of the examples."""

    def _fill_text(self, text: str, width: int, indent: str) -> str:
        if "\n" in text:
            return super()._fill_text(text, width, indent)
        return argparse.HelpFormatter._fill_text(self, text, width, indent)


def add_port(command: argparse.ArgumentParser) -> None:
    command.add_argument(
        "--port",
        type=int,
        metavar=_("NUMBER"),
        help=_("port to serve on (or EBBLINE_PORT; otherwise 8000)"),
    )


def add_note(command: argparse.ArgumentParser) -> None:
    command.add_argument(
        "--note",
        default="",
        metavar=_("SENTENCE"),
        help=_("why; it stands on the pages of the edition"),
    )
