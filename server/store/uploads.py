"""Uploads: files kept byte for byte, their mapping and their checking report."""

import datetime as dt
import hashlib
import json
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import asdict

from sqlalchemy import delete, insert, select, true, update
from sqlalchemy.orm import Session
from sqlalchemy.sql import ColumnElement

from server.store import collections, foreseen
from server.store.base import LARGEST
from server.store.errors import Missing, Refused
from server.store.records import Basis, Upload, UploadFile
from server.store.tables import Collection, Edition
from server.store.tables import Upload as UploadRow
from server.store.tables import UploadFile as FileRow

_FILE = (
    FileRow.role,
    FileRow.name,
    FileRow.size,
    FileRow.sha256,
    FileRow.mapping,
    FileRow.erased,
    FileRow.erased_by,
    FileRow.erased_why,
)


def receive(
    session: Session,
    *,
    collection: str,
    files: Sequence[tuple[str, str, bytes]],
    by: str,
    at: dt.datetime,
) -> Upload:
    """Keep the files, each (role, name, content). Raises: Missing for the collection; ValueError
    where a role comes twice or there is no file."""
    roles = [role for role, _, _ in files]
    if not roles or len(set(roles)) != len(roles):
        raise ValueError(f"an upload has one file of each role, at least one; found {roles}")
    row = {
        "collection_id": collections.find(session, collection).id,
        "received": at,
        "by": by,
        "reader": "",
        "report": "",
    }
    upload_id = session.execute(insert(UploadRow).values(row).returning(UploadRow.id)).scalar_one()
    for role, name, content in files:
        session.execute(
            insert(FileRow).values(
                upload_id=upload_id,
                role=role,
                name=name,
                size=len(content),
                sha256=hashlib.sha256(content).hexdigest(),
                mapping="",
                content=content,
            )
        )
    return find(session, upload_id)


def find(session: Session, upload_id: int) -> Upload:
    """Raises: Missing."""
    found = _read(session, UploadRow.id == upload_id) if 0 < upload_id <= LARGEST else ()
    if not found:
        raise Missing("upload", upload_id)
    return found[0]


def lock(session: Session, upload_id: int) -> Upload:
    """The upload, held until the transaction ends, so that what is read of it stays true. (SQLite's
    writers take turns anyway.) Raises: Missing."""
    find(session, upload_id)
    session.execute(select(UploadRow.id).where(UploadRow.id == upload_id).with_for_update())
    return find(session, upload_id)


def require_read_so(session: Session, upload: Upload) -> None:
    """Refuse where the files of a draft are no longer read as when they were checked; nobody else
    can change that before the transaction ends. Raises: Missing, Refused."""
    now = lock(session, upload.id)
    if (now.files, now.basis) != (upload.files, upload.basis):
        raise Refused(
            "What was said of upload {upload} was changed while it was being checked. Check it "
            "once more.",
            upload=upload.id,
        )


def require_unchanged(session: Session, upload: Upload) -> None:
    """Refuse where a draft is no longer what was read of it; nobody else can change it before the
    transaction ends. Raises: Missing, Refused."""
    if lock(session, upload.id) != upload:
        raise Refused(
            "Upload {upload} was changed while it was being committed. Look at what it says now, "
            "then commit it.",
            upload=upload.id,
        )


def listing(session: Session, collection: str | None = None) -> tuple[Upload, ...]:
    """Uploads of a collection, or of all, newest first; their contents are not read."""
    if collection is None:
        return _read(session, true())
    return _read(session, UploadRow.collection_id == collections.id_of(collection))


def file_bytes(session: Session, upload_id: int, role: str) -> bytes:
    """The file as handed in. Raises: Missing, with the roles there are."""
    content = session.execute(
        select(FileRow.content).where(FileRow.upload_id == upload_id, FileRow.role == role)
    ).scalar_one_or_none()
    if content is None:
        known = [file.role for file in find(session, upload_id).files]
        raise Missing("file", role, known)
    return content


def set_mapping(
    session: Session, upload_id: int, *, mappings: Mapping[str, str], basis: Basis
) -> Upload:
    """How to read each file (role -> JSON of the mapping), and the basis. The report of an earlier
    reading is dropped. Raises: Missing; Refused for an upload that has become an edition."""
    upload = _draft(session, upload_id)
    for role, mapping in mappings.items():
        if role not in {file.role for file in upload.files}:
            raise Missing("file", role, [file.role for file in upload.files])
        session.execute(
            update(FileRow)
            .where(FileRow.upload_id == upload_id, FileRow.role == role)
            .values(mapping=mapping)
        )
    said = json.dumps(asdict(basis), ensure_ascii=False)
    foreseen.forget(session, upload_id)
    _set(session, upload_id, basis=said, report="", reader="", base=None)
    return find(session, upload_id)


def set_roles(session: Session, upload_id: int, *, roles: Mapping[str, str]) -> Upload:
    """Other roles for files of a draft, by their old ones. A file that moves loses its mapping, and
    the report of an earlier reading is dropped. Raises: Missing; Refused for an edition."""
    upload = _draft(session, upload_id)
    moved = {old: new for old, new in roles.items() if old != new}
    for role in moved:
        if role not in {file.role for file in upload.files}:
            raise Missing("file", role, [file.role for file in upload.files])
    for before, after in (
        *((old, f"{old} moved") for old in moved),  # out of the way, since roles may be exchanged
        *((f"{old} moved", new) for old, new in moved.items()),
    ):
        session.execute(
            update(FileRow)
            .where(FileRow.upload_id == upload_id, FileRow.role == before)
            .values(role=after, mapping="")
        )
    foreseen.forget(session, upload_id)
    _set(session, upload_id, report="", reader="", base=None)
    return find(session, upload_id)


def set_report(session: Session, upload_id: int, *, report: str, reader: str, base: int) -> Upload:
    """What the checks found (JSON), the version of the reader, and the number of the edition that
    stood then (0: none). Raises: Missing; Refused for an upload that has become an edition."""
    _draft(session, upload_id)
    foreseen.forget(session, upload_id)
    _set(session, upload_id, report=report, reader=reader, base=base)
    return find(session, upload_id)


def erase(session: Session, upload_id: int) -> None:
    """Throw a draft away, files and all. Raises: Missing; Refused for one that has become an
    edition."""
    _draft(session, upload_id)
    foreseen.forget(session, upload_id)
    session.execute(delete(FileRow).where(FileRow.upload_id == upload_id))
    session.execute(delete(UploadRow).where(UploadRow.id == upload_id))


def empty(session: Session, upload_id: int, *, by: str, why: str, at: dt.datetime) -> None:
    """Erase the bytes of all files of an upload; their names, sizes, digests and mappings stay, and
    so does the report. Raises: Missing."""
    upload = lock(session, upload_id)
    session.execute(
        update(FileRow)
        .where(FileRow.upload_id == upload_id, FileRow.erased.is_(None))
        .values(content=b"", erased=at, erased_by=by, erased_why=why)
    )
    collections.touch(session, collections.find(session, upload.collection).id)


def erasures(session: Session, collection: str) -> dict[int, tuple[UploadFile, ...]]:
    """The files whose bytes were erased, by the edition that was made of them. One statement."""
    rows = session.execute(
        select(
            Edition.number,
            *_FILE,
        )
        .join(FileRow, FileRow.upload_id == Edition.upload_id)
        .where(Edition.collection_id == collections.id_of(collection), FileRow.erased.is_not(None))
        .order_by(Edition.number, FileRow.role)
    ).all()
    found: dict[int, tuple[UploadFile, ...]] = {}
    for row in rows:
        found[row.number] = (*found.get(row.number, ()), UploadFile(*row[1:]))
    return found


def digests_of_editions(session: Session, collection: str) -> dict[int, dict[str, str]]:
    """SHA-256 of the files each edition was made of, by their roles. One statement."""
    rows = session.execute(
        select(Edition.number, FileRow.role, FileRow.sha256)
        .join(FileRow, FileRow.upload_id == Edition.upload_id)
        .where(Edition.collection_id == collections.id_of(collection))
    ).all()
    found: dict[int, dict[str, str]] = {}
    for row in rows:
        found.setdefault(row.number, {})[row.role] = row.sha256
    return found


def contents_of_editions(
    session: Session, collection: str, role: str, numbers: Iterable[int]
) -> dict[int, tuple[UploadFile, bytes]]:
    """The files of one role that these editions were made of, with their bytes. One statement."""
    rows = session.execute(
        select(Edition.number, *_FILE, FileRow.content)
        .join(FileRow, FileRow.upload_id == Edition.upload_id)
        .where(
            Edition.collection_id == collections.id_of(collection),
            Edition.number.in_(tuple(numbers)),
            FileRow.role == role,
        )
    ).all()
    found = (tuple(row) for row in rows)
    return {number: (UploadFile(*file), content) for number, *file, content in found}


def _draft(session: Session, upload_id: int) -> Upload:
    upload = lock(session, upload_id)
    if upload.edition is not None:
        raise Refused(
            "Upload {upload} has become edition {edition} and stays as it is. "
            "Hand the corrected file in as a new upload.",
            upload=upload_id,
            edition=upload.edition,
        )
    return upload


def _set(session: Session, upload_id: int, **values: object) -> None:
    session.execute(update(UploadRow).where(UploadRow.id == upload_id).values(values))


def _read(session: Session, which: ColumnElement[bool]) -> tuple[Upload, ...]:
    """Uploads with their files, newest first. Two statements."""
    rows = session.execute(
        select(
            UploadRow.id,
            Collection.code,
            UploadRow.received,
            UploadRow.by,
            UploadRow.basis,
            UploadRow.reader,
            UploadRow.report,
            UploadRow.base,
            Edition.number,
        )
        .join(Collection, Collection.id == UploadRow.collection_id)
        .outerjoin(Edition, Edition.upload_id == UploadRow.id)
        .where(which)
        .order_by(UploadRow.id.desc())
    ).all()
    files: dict[int, list[UploadFile]] = {row.id: [] for row in rows}
    for file in session.execute(
        select(
            FileRow.upload_id,
            *_FILE,
        ).where(FileRow.upload_id.in_(files))
    ):
        files[file.upload_id].append(UploadFile(*file[1:]))
    return tuple(
        Upload(
            id=row.id,
            collection=row.code,
            received=row.received,
            by=row.by,
            files=tuple(sorted(files[row.id], key=lambda file: file.role)),
            basis=None if row.basis is None else Basis(**json.loads(row.basis)),
            reader=row.reader,
            report=row.report,
            edition=row.number,
            base=row.base,
        )
        for row in rows
    )
