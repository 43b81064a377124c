"""`ebbline rebuild`: make every edition anew from the kept bytes, and compare."""

import argparse

from server.accounts.viewer import LOCAL
from server.actions.rebuild_editions import Rebuilt, rebuild_editions
from server.cli.opened import opened
from server.cli.options import Commands, add_command
from server.config import Config
from server.sentences.text import _
from server.store import collections


def add(commands: Commands) -> None:
    command = add_command(
        commands,
        "rebuild",
        run,
        summary=_("make every edition anew from the kept files, and compare"),
        text=_(
            "Reads the files of every edition again, as they were handed in, and compares the hash "
            "of what they give with the one on record. Nothing is written. It ends with code 1 "
            "where one differs. Where the bytes of an edition were erased, the database alone is "
            "compared, and editions built on it are made anew upon it as it is stored."
        ),
        examples=("ebbline rebuild", "ebbline rebuild --collection quillmere"),
    )
    command.add_argument("--collection", metavar="CODE", help=_("only this one"))


def run(asked: argparse.Namespace, config: Config) -> int:
    same = True
    with opened(config) as session:
        codes = (
            [asked.collection]
            if asked.collection
            else [one.code for one in collections.all_collections(session)]
        )
        for code in codes:
            for one in rebuild_editions(session, collection=code, by=LOCAL):
                print(_line(code, one))
                same = same and one.sound
    return 0 if same else 1


def _line(collection: str, one: Rebuilt) -> str:
    place = _("{collection}, edition {number}", collection=collection, number=one.number)
    digest = one.recorded[:12]
    if one.same and one.upon:
        return _(
            "{place}: the same, {digest}, upon edition {base} as it is stored",
            place=place,
            digest=digest,
            base=one.upon,
        )
    if one.same:
        return _("{place}: the same, {digest}", place=place, digest=digest)
    if one.erased and one.sound:
        why = _(one.reason, **one.values)
        return _(
            "{place}: as recorded in the database, {digest}; it cannot be made anew. {why}",
            place=place,
            digest=digest,
            why=why,
        )
    if one.reason:
        why = _(one.reason, **one.values)
        return _("{place}: cannot be made anew. {why}", place=place, why=why)
    return _(
        "{place}: differs. On record {recorded}, in the database {stored}, from the files {reread}",
        place=place,
        recorded=one.recorded[:12],
        stored=one.stored[:12],
        reread=one.reread[:12],
    )
