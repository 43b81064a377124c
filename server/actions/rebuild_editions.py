"""Make every edition anew from the kept bytes, and compare: nothing is written."""

import hashlib
from dataclasses import dataclass, field, replace

from server.accounts.viewer import Right, Viewer
from server.actions.commit_upload import read
from server.actions.laid_over import Base, made_of
from server.intake.parsing import READER
from server.store import (
    areas,
    breaks,
    causes,
    collections,
    digests,
    editions,
    rows,
    schedules,
    uploads,
)
from server.store.connect import Session
from server.store.errors import Refused
from server.store.records import (
    Area,
    Basis,
    Break,
    Cause,
    Edition,
    Key,
    Selection,
    Upload,
    Vector,
)

EVERYTHING = Selection(cause=None)


@dataclass(frozen=True, slots=True)
class Rebuilt:
    """One edition: its recorded hash, and what storage and files give now."""

    number: int
    recorded: str
    stored: str  # hash of the schedules as they stand in the database
    reread: str  # hash of the edition made anew from its files; empty where it cannot be
    reason: str = ""  # catalogue text: why it cannot be
    values: dict[str, object] = field(default_factory=dict)  # fill the reason
    erased: bool = False  # its bytes were erased on demand
    upon: int = 0  # made anew upon this edition as it is stored, since its bytes were erased

    @property
    def same(self) -> bool:
        return self.recorded == self.stored == self.reread

    @property
    def sound(self) -> bool:
        """The same, or what is left of it is: storage, where its bytes were erased."""
        return self.same or (self.erased and self.recorded == self.stored)


class BytesErased(Refused):
    """An edition whose files were emptied at the data owner's demand."""


@dataclass(frozen=True, slots=True)
class _Content:
    """What an edition holds, made anew."""

    cells: dict[Key, Vector]
    areas: tuple[Area, ...]
    breaks: tuple[Break, ...]
    causes: tuple[Cause, ...]
    basis: Basis

    @property
    def digest(self) -> str:
        return digests.of_edition(
            (
                digests.of_basis(self.basis),
                *map(digests.of_area, self.areas),
                *map(digests.of_break, self.breaks),
                *map(digests.of_cause, self.causes),
                *(digests.of_schedule(key, cell) for key, cell in self.cells.items()),
            )
        )

    def load(self, selection: Selection) -> dict[Key, Vector]:
        """Its schedules of some areas and years."""
        return {
            key: cell
            for key, cell in self.cells.items()
            if (selection.areas is None or key.area in selection.areas)
            and (selection.periods is None or key.period in selection.periods)
        }


def rebuild_editions(session: Session, *, collection: str, by: Viewer) -> tuple[Rebuilt, ...]:
    """Every edition of the collection in the order they were made, from its files, their mappings
    and its base, by the same steps as a commit.

    Raises: NotAllowed; Missing for the collection.
    """
    by.require(Right.READ)
    collections.find(session, collection)
    in_order = editions.listing(session, collection)[::-1]
    contents: dict[int, _Content] = {}
    upon: dict[int, int] = {}  # edition -> the one it rests on that could only be taken as stored
    report = []
    for place, edition in enumerate(in_order):
        number, stored = edition.number, _stored(session, collection, edition)
        one = Rebuilt(number, edition.digest, stored.digest, "")
        try:
            made = contents[number] = _anew(session, edition, contents)
            upon[number] = 0 if edition.replaces else upon.get(edition.base, 0)
            report.append(replace(one, reread=made.digest, upon=upon[number]))
        except Refused as refused:
            erased = isinstance(refused, BytesErased)
            report.append(replace(one, reason=refused.text, values=refused.values, erased=erased))
            if report[-1].erased and report[-1].sound:
                contents[number], upon[number] = stored, number
        still_needed = {later.base for later in in_order[place + 1 :]}
        contents = {number: made for number, made in contents.items() if number in still_needed}
    return tuple(report)


def _stored(session: Session, collection: str, edition: Edition) -> _Content:
    return _Content(
        schedules.load(session, collection, edition.number, EVERYTHING),
        areas.listing(session, collection, edition.number),
        breaks.listing(session, collection, edition.number),
        causes.listing(session, collection, edition.number),
        edition.basis,
    )


def _anew(session: Session, edition: Edition, contents: dict[int, _Content]) -> _Content:
    """Raises: Refused where the files, their reading or the base are not to be had."""
    upload, basis = _readable(session, edition)
    base = _Content({}, (), (), (), basis)
    if edition.base and not edition.replaces:
        if edition.base not in contents:
            raise Refused("Its base, edition {base}, could not be made anew.", base=edition.base)
        base = contents[edition.base]

    stood = Base(base.areas, base.breaks, base.load, base.causes, lambda: base.cells)
    made = made_of(read(session, upload), edition.taking, stood)
    kept = {key: cell for key, cell in base.cells.items() if key not in made.ended}
    said = {rows.of_break(one) for one in (*made.ended_breaks, *made.breaks)}
    held = (*(one for one in base.breaks if rows.of_break(one) not in said), *made.breaks)
    return _Content(kept | made.cells, made.areas, held, made.causes.over(base.causes), basis)


def _readable(session: Session, edition: Edition) -> tuple[Upload, Basis]:
    upload = uploads.find(session, edition.upload) if edition.upload else None
    if upload is None or upload.basis is None:
        raise Refused("It was not made of an upload.")
    if upload.reader != READER:
        raise Refused(
            "It was read by {then}; this version reads with {now}, which may read otherwise.",
            then=upload.reader,
            now=READER,
        )
    for file in upload.files:
        if file.erased is not None:
            raise BytesErased(
                "The bytes of {file} were erased on {day} by {who}: {why}",
                file=file.name,
                day=file.erased.date().isoformat(),
                who=file.erased_by,
                why=file.erased_why,
            )
        content = uploads.file_bytes(session, upload.id, file.role)
        if hashlib.sha256(content).hexdigest() != file.sha256:
            raise Refused(
                "The kept file {file} of upload {upload} is damaged: its SHA-256 is no longer the "
                "one recorded. Restore it from a backup.",
                file=file.name,
                upload=upload.id,
            )
    return upload, upload.basis
