"""The tables. Only query files of the store see these rows; what leaves is a record or an array."""

import datetime as dt

from sqlalchemy import (
    CheckConstraint,
    ForeignKey,
    ForeignKeyConstraint,
    Index,
    LargeBinary,
    String,
    Text,
)
from sqlalchemy.orm import Mapped, mapped_column

from server.store.base import Base
from server.store.content_tables import (
    AreaName,
    AreaRange,
    BasisRange,
    BreakRange,
    CauseLabel,
    CauseRange,
    Grid,
    Schedule,
)

__all__ = [
    "AreaName",
    "AreaRange",
    "Base",
    "BasisRange",
    "BreakRange",
    "CauseLabel",
    "CauseRange",
    "Collection",
    "Edition",
    "EditionEvent",
    "Foreseen",
    "Grid",
    "Job",
    "Mask",
    "Policy",
    "Schedule",
    "Statement",
    "Upload",
    "UploadFile",
]


class Collection(Base):
    __tablename__ = "collection"
    __table_args__ = {"sqlite_strict": True}

    id: Mapped[int] = mapped_column(primary_key=True)
    code: Mapped[str] = mapped_column(String(32), unique=True)
    name: Mapped[str]
    owner: Mapped[str]
    revision: Mapped[int]
    made: Mapped[dt.datetime]


class Upload(Base):
    """A draft until an edition names it."""

    __tablename__ = "upload"
    # autoincrement: the number of an erased draft is not given to another
    __table_args__ = {"sqlite_strict": True, "sqlite_autoincrement": True}

    id: Mapped[int] = mapped_column(primary_key=True)
    collection_id: Mapped[int] = mapped_column(ForeignKey("collection.id"), index=True)
    received: Mapped[dt.datetime]
    by: Mapped[str]
    basis: Mapped[str | None] = mapped_column(Text)  # JSON
    reader: Mapped[str]
    report: Mapped[str] = mapped_column(Text)
    base: Mapped[int | None]


class UploadFile(Base):
    __tablename__ = "upload_file"
    __table_args__ = {"sqlite_strict": True}

    upload_id: Mapped[int] = mapped_column(
        ForeignKey("upload.id", ondelete="CASCADE"), primary_key=True
    )
    role: Mapped[str] = mapped_column(primary_key=True)
    name: Mapped[str]
    size: Mapped[int]
    sha256: Mapped[str] = mapped_column(String(64))
    mapping: Mapped[str] = mapped_column(Text)
    content: Mapped[bytes] = mapped_column(LargeBinary)  # empty once erased
    erased: Mapped[dt.datetime | None]
    erased_by: Mapped[str] = mapped_column(server_default="")
    erased_why: Mapped[str] = mapped_column(Text, server_default="")


class Foreseen(Base):
    """What an edition made of a draft would change, by what is taken of it."""

    __tablename__ = "foreseen"
    __table_args__ = {"sqlite_strict": True}

    upload_id: Mapped[int] = mapped_column(
        ForeignKey("upload.id", ondelete="CASCADE"), primary_key=True
    )
    taking: Mapped[str] = mapped_column(Text, primary_key=True)  # as in an address; empty: all
    base: Mapped[int]
    content: Mapped[str] = mapped_column(Text)  # JSON


class Edition(Base):
    """One immutable state. The row is never updated; what befalls it later is an EditionEvent."""

    __tablename__ = "edition"
    __table_args__ = (
        CheckConstraint("number > base", name="follows_its_base"),
        {"sqlite_strict": True},
    )

    collection_id: Mapped[int] = mapped_column(ForeignKey("collection.id"), primary_key=True)
    number: Mapped[int] = mapped_column(primary_key=True, autoincrement=False)
    base: Mapped[int]
    replaces: Mapped[bool]
    made: Mapped[dt.datetime]
    by: Mapped[str]
    note: Mapped[str] = mapped_column(Text)
    digest: Mapped[str] = mapped_column(String(64))
    upload_id: Mapped[int | None] = mapped_column(ForeignKey("upload.id"), unique=True)
    taking: Mapped[str] = mapped_column(Text, server_default="")  # JSON; empty: all of the upload
    effect: Mapped[str] = mapped_column(Text, server_default="")  # JSON, counts of what it changed


class EditionEvent(Base):
    __tablename__ = "edition_event"
    __table_args__ = (
        ForeignKeyConstraint(
            ["collection_id", "number"], ["edition.collection_id", "edition.number"]
        ),
        CheckConstraint("what IN ('withdrawn', 'reinstated')", name="what"),
        Index("ix_edition_event_of_edition", "collection_id", "number", "id"),
        {"sqlite_strict": True},
    )

    id: Mapped[int] = mapped_column(primary_key=True)
    collection_id: Mapped[int]
    number: Mapped[int]
    what: Mapped[str]
    at: Mapped[dt.datetime]
    by: Mapped[str]
    note: Mapped[str] = mapped_column(Text)


class Policy(Base):
    """What may be shown of a collection's small counts; a change is a new number."""

    __tablename__ = "policy"
    __table_args__ = {"sqlite_strict": True}

    collection_id: Mapped[int] = mapped_column(ForeignKey("collection.id"), primary_key=True)
    number: Mapped[int] = mapped_column(primary_key=True, autoincrement=False)
    terms: Mapped[str] = mapped_column(Text)  # JSON
    made: Mapped[dt.datetime]
    by: Mapped[str]
    note: Mapped[str] = mapped_column(Text)


class Mask(Base):
    """Which cells of an edition are withheld under a policy; made once, never updated."""

    __tablename__ = "mask"
    __table_args__ = (
        ForeignKeyConstraint(
            ["collection_id", "edition"], ["edition.collection_id", "edition.number"]
        ),
        ForeignKeyConstraint(
            ["collection_id", "policy"], ["policy.collection_id", "policy.number"]
        ),
        {"sqlite_strict": True},
    )

    collection_id: Mapped[int] = mapped_column(primary_key=True)
    edition: Mapped[int] = mapped_column(primary_key=True, autoincrement=False)
    policy: Mapped[int] = mapped_column(primary_key=True, autoincrement=False)
    digest: Mapped[str] = mapped_column(String(64))
    content: Mapped[bytes] = mapped_column(LargeBinary)
    made: Mapped[dt.datetime]


class Statement(Base):
    """What the analyst says of an edition's quality; the newest row holds, all are kept."""

    __tablename__ = "statement"
    __table_args__ = (
        ForeignKeyConstraint(
            ["collection_id", "edition"], ["edition.collection_id", "edition.number"]
        ),
        Index("ix_statement_of_edition", "collection_id", "edition", "id"),
        {"sqlite_strict": True},
    )

    id: Mapped[int] = mapped_column(primary_key=True)
    collection_id: Mapped[int]
    edition: Mapped[int]
    at: Mapped[dt.datetime]
    by: Mapped[str]
    answers: Mapped[str] = mapped_column(Text)  # JSON, by question


class Job(Base):
    __tablename__ = "job"
    __table_args__ = (
        CheckConstraint(
            "state IN ('queued', 'running', 'done', 'failed', 'cancelled')", name="state"
        ),
        Index("ix_job_by_state", "state", "id"),
        {"sqlite_strict": True, "sqlite_autoincrement": True},
    )

    id: Mapped[int] = mapped_column(primary_key=True)
    kind: Mapped[str]
    params: Mapped[str] = mapped_column(Text)  # JSON, keys sorted
    digest: Mapped[str] = mapped_column(String(64))  # of kind and params: same request, same digest
    state: Mapped[str]
    done: Mapped[int]
    total: Mapped[int]
    message: Mapped[str] = mapped_column(Text)
    attempt: Mapped[int]  # a worker writes only under the attempt it claimed
    beat: Mapped[int]  # a counter, judged by the watcher's own clock
    queued: Mapped[dt.datetime]
    started: Mapped[dt.datetime | None]
    ended: Mapped[dt.datetime | None]
