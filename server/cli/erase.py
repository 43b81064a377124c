"""`ebbline erase`: the bytes of an upload, where personal data were sent by mistake."""

import argparse
import datetime as dt

from server.accounts.viewer import LOCAL
from server.actions.erase_bytes import erase_bytes
from server.cli.opened import opened
from server.cli.options import Commands, add_command
from server.cli.refusals import Declined
from server.config import Config
from server.sentences.text import _


def add(commands: Commands) -> None:
    command = add_command(
        commands,
        "erase",
        run,
        summary=_("erase the bytes of an upload"),
        text=_(
            "Erases the files of an upload that has become an edition, where personal data were "
            "sent by mistake. Their digests, the mapping, the report and the edition stay; the "
            "edition can no longer be made anew. Backups are out of its reach, and so is what the "
            "report quotes."
        ),
        examples=('ebbline erase 4 --why "Names of the deceased stood in a column."',),
    )
    command.add_argument("upload", type=int, metavar=_("UPLOAD"), help=_("its number"))
    command.add_argument("--why", required=True, metavar=_("SENTENCE"), help=_("kept on record"))


def run(asked: argparse.Namespace, config: Config) -> int:
    with opened(config) as session:
        done = erase_bytes(
            session, upload_id=asked.upload, why=asked.why, by=LOCAL, now=dt.datetime.now(dt.UTC)
        )
    if not done.gone:
        raise Declined(
            _(
                "The bytes were erased from the upload, but somebody was reading, so that a copy "
                "may stand in the database’s log of writes. Run the command again."
            ),
            exit_code=1,
        )
    print(_("The bytes of upload {upload} were erased.", upload=asked.upload))
    return 0
