"""`ebbline hand-in`: from files to an edition in one go, or to the list of what is wrong."""

import argparse
import datetime as dt
import sys
from dataclasses import asdict

from server.accounts.viewer import LOCAL
from server.actions.check_upload import check_upload
from server.actions.commit_upload import commit_upload
from server.actions.create_collection import create_collection
from server.actions.discard_upload import discard_upload
from server.actions.map_upload import map_upload
from server.actions.receive_upload import receive_upload
from server.cli import reading, reading_options
from server.cli.basis import basis as stated_basis
from server.cli.opened import opened
from server.cli.options import Commands, add_command, add_note
from server.cli.refusals import Declined
from server.config import Config
from server.intake.mapping import ROLES
from server.intake.parsing import Handed, parse
from server.intake.recognising.look import Before
from server.intake.report import Report
from server.pages.upload_reading import earlier
from server.results.preview import years_of
from server.sentences import taking as taking_say
from server.sentences import uploads as say
from server.sentences.numbers import as_needed
from server.sentences.text import _, n_
from server.store import collections, editions
from server.store.connect import Session
from server.store.errors import Refused
from server.store.records import GIVES_WAY, Basis, Taking


def add(commands: Commands) -> None:
    command = add_command(
        commands,
        "hand-in",
        run,
        summary=_("check files and make an edition of them"),
        text=_(
            "Reads tables of deaths and population (births if you have them) as text or XLSX, "
            "finds out how they stand and which column is which, runs every check, and makes the "
            "next edition of the collection. What a file does not say by itself must be said. "
            "With errors it prints them all, writes nothing and ends with code 2. The basis must "
            "be stated for a new collection; later editions take it over unless told otherwise."
        ),
        examples=(
            "ebbline hand-in --check-only --counts counts.csv --area isle=Isle --open-age",
            "ebbline hand-in --collection isle --name 'Isle, all deaths' --owner 'Our desk' \\",
            "    --deaths deaths.csv --population population.csv --whole isle=Isle \\",
            "    --people residents --dated-by death --population-is midyear \\",
            "    --population-date '1 July of each year' --source 'civil register' \\",
            "    --note '1999 to 2023, first delivery'",
            "ebbline hand-in --collection isle --counts 2024.csv --provisional 2024",
            "ebbline hand-in --collection isle --counts all.csv --take-years 2023-2024 \\",
            "    --gives-way years --note '2023 and 2024 anew, in every area'",
        ),
    )
    command.add_argument("--collection", metavar="CODE", help=_("code of the collection"))
    command.add_argument("--name", metavar=_("NAME"), help=_("opens a new collection of this name"))
    command.add_argument("--owner", metavar=_("OFFICE"), help=_("data owner of a new collection"))
    command.add_argument("--check-only", action="store_true", help=_("check and write nothing"))
    add_note(command)
    _add_taking(command)
    reading_options.add_files(command)
    reading_options.add_mapping(command)
    reading_options.add_form(command)
    reading_options.add_basis(command)


def _add_taking(command: argparse.ArgumentParser) -> None:
    command.add_argument(
        "--take-area", action="append", metavar="CODE", help=_("only this area; may be repeated")
    )
    command.add_argument(
        "--take-years", metavar=_("YEARS"), default="", help=_("only these, such as 2019,2021-2023")
    )
    command.add_argument(
        "--gives-way",
        choices=GIVES_WAY,
        default=GIVES_WAY[0],
        help=_(
            "what the edition before loses beside the counts handed in again: nothing (cells), all "
            "of the areas and years taken (handed), all of the years, all of the areas, or all"
        ),
    )


def _taking(asked: argparse.Namespace) -> Taking:
    """What of the files is taken. BadValue where the years are none."""
    areas = tuple(dict.fromkeys(asked.take_area or ()))
    return Taking(areas, years_of(asked.take_years), asked.gives_way)


def run(asked: argparse.Namespace, config: Config) -> int:
    files = reading.handed(asked, limit=config.upload_limit, before=_before(asked, config))
    report = Report.of(parse(files))
    for problem in report.problems:
        print(problem.sentence(_, as_needed))
    print(say.outcome(len(report.errors), len(report.warnings), report.rows, report.sound))
    if report.errors:
        print(_("Nothing was written."), file=sys.stderr)
        print(
            _(
                "The mapping, where it is to be corrected, is --column, --area, --whole, "
                "--delivered, --sex, --sex-code, --open-age and --provisional; the form of the "
                "file --sheet, --headings, --numbers, --unit, --shape and --not-stated."
            ),
            file=sys.stderr,
        )
        return 2
    if asked.check_only:
        return 0
    if not asked.collection:
        raise Declined(_("Say which collection the edition is for: --collection CODE"))
    with opened(config) as session:
        return _commit(session, asked, files, report, limit=config.upload_limit)


def _before(asked: argparse.Namespace, config: Config) -> dict[str, tuple[Before, ...]]:
    """How files of each role were read for the newest editions, where that was asked for."""
    if not asked.as_before:
        return {}
    if not asked.collection:
        raise Declined(_("--as-before needs the collection: --collection CODE"))
    with opened(config) as session:
        collections.find(session, asked.collection)
        return {role: earlier(session, asked.collection, role) for role in ROLES}


def _commit(
    session: Session,
    asked: argparse.Namespace,
    files: list[Handed],
    report: Report,
    *,
    limit: int,
) -> int:
    now, taking = dt.datetime.now(dt.UTC), _taking(asked)
    if not any(one.code == asked.collection for one in collections.all_collections(session)):
        basis = stated_basis(asked, None)
        _open(session, asked, report, now)
    else:
        basis = stated_basis(asked, _standing_basis(session, asked.collection))
    upload = receive_upload(
        session,
        collection=asked.collection,
        files=[(file.role, file.name, file.content) for file in files],
        by=LOCAL,
        now=now,
        limit=limit,
    )
    mappings = {file.role: file.mapping for file in files}
    map_upload(session, upload_id=upload.id, mappings=mappings, basis=basis, by=LOCAL, now=now)
    check_upload(session, upload_id=upload.id)
    try:
        edition = commit_upload(
            session,
            upload_id=upload.id,
            note=asked.note,
            by=LOCAL,
            now=now,
            taking=taking,
        )
    except Refused:  # the files are still where they were: no draft of them is needed
        discard_upload(session, upload_id=upload.id, by=LOCAL)
        raise
    print(
        _(
            "Edition {number} of {collection} was made; content {digest}.",
            number=edition.number,
            collection=asked.collection,
            digest=edition.digest[:12],
        )
    )
    print(taking_say.columns(edition.base, asdict(edition.effect) if edition.effect else None))
    return 0


def _open(session: Session, asked: argparse.Namespace, report: Report, now: dt.datetime) -> None:
    """Open the collection that --name and --owner describe, unless no edition would come of it."""
    if not asked.name or not asked.owner:
        known = [one.code for one in collections.all_collections(session)]
        raise Declined(
            _(
                "There is no collection {code}; there are: {known}. Correct the code, or give "
                "--name and --owner to open it.",
                code=asked.collection,
                known=", ".join(known) or _("none"),
            )
        )
    if report.warnings and not asked.note.strip():
        raise Declined(
            n_(
                "There is one warning and no note. Look at it; then say with --note why the "
                "figures may stand.",
                "There are {count} warnings and no note. Look at each; then say with --note why "
                "the figures may stand.",
                len(report.warnings),
            )
        )
    create_collection(
        session, code=asked.collection, name=asked.name, owner=asked.owner, by=LOCAL, now=now
    )


def _standing_basis(session: Session, code: str) -> Basis | None:
    standing = editions.newest_standing(session, code)
    return standing.basis if standing else None
