"""Tables of the content of editions: each row holds over a range of them."""

import datetime as dt
from typing import ClassVar

from sqlalchemy import (
    CheckConstraint,
    Double,
    ForeignKey,
    Index,
    LargeBinary,
    String,
    Text,
    UniqueConstraint,
    and_,
    false,
    or_,
    text,
)
from sqlalchemy.orm import Mapped, mapped_column
from sqlalchemy.sql import ColumnElement, SQLColumnExpression

from server.store.base import Base


class Grid(Base):
    """Age groups, addressed by their starts: '0,1,5,10'."""

    __tablename__ = "grid"
    __table_args__ = {"sqlite_strict": True}

    id: Mapped[int] = mapped_column(primary_key=True)
    starts: Mapped[str] = mapped_column(Text, unique=True)


class Ranged:
    """Content that holds in the editions `first` up to, but not with, `until` (none: still)."""

    KEY: ClassVar[tuple[str, ...]]  # the columns of which one row at a time holds

    id: Mapped[int] = mapped_column(primary_key=True)
    collection_id: Mapped[int] = mapped_column(ForeignKey("collection.id"))
    digest: Mapped[bytes] = mapped_column(LargeBinary)
    first: Mapped[int]
    until: Mapped[int | None]

    @classmethod
    def holds_in(cls, number: int | SQLColumnExpression[int]) -> ColumnElement[bool]:
        return and_(cls.first <= number, or_(cls.until.is_(None), cls.until > number))


def _ranged(name: str, *key: str) -> tuple[CheckConstraint | Index, ...]:
    """What every ranged table keeps: no empty range, one open row of a key, a path to read by."""
    still = text("until IS NULL")
    return (
        CheckConstraint("until IS NULL OR until > first", name="range"),
        Index(
            f"uq_{name}_holding",
            "collection_id",
            *key,
            unique=True,
            sqlite_where=still,
            postgresql_where=still,
        ),
        Index(f"ix_{name}_by_key", "collection_id", *key, "first", "until"),
    )


_BREAK_KEY = ("area", "period", "kind", "cause")
_SCHEDULE_KEY = ("area", "sex", "period", "measure", "cause")


class Schedule(Ranged, Base):
    """One vector over age, packed '<f8'."""

    __tablename__ = "schedule"
    __table_args__ = (
        *_ranged("schedule", *_SCHEDULE_KEY),
        CheckConstraint("length(vector) % 8 = 0", name="whole_numbers_of_8_bytes"),
        CheckConstraint("sex IN ('f', 'm', 'p')", name="sex"),
        CheckConstraint("status IN ('final', 'provisional')", name="status"),
        {"sqlite_strict": True},
    )
    KEY: ClassVar = _SCHEDULE_KEY

    area: Mapped[str] = mapped_column(String(32))
    sex: Mapped[str] = mapped_column(String(1))
    period: Mapped[str] = mapped_column(String(32))
    period_start: Mapped[dt.date]
    measure: Mapped[str] = mapped_column(String(32))
    cause: Mapped[str] = mapped_column(String(32))
    status: Mapped[str] = mapped_column(String(16))
    grid_id: Mapped[int] = mapped_column(ForeignKey("grid.id"))
    vector: Mapped[bytes] = mapped_column(LargeBinary)
    estimated: Mapped[bool] = mapped_column(server_default=false())


class AreaRange(Ranged, Base):
    """Place of an area in the tree. Its name is presentation and stands in area_name."""

    __tablename__ = "area"
    __table_args__ = (*_ranged("area", "code"), {"sqlite_strict": True})
    KEY: ClassVar = ("code",)

    code: Mapped[str] = mapped_column(String(32))
    parent: Mapped[str] = mapped_column(String(32))
    delivered: Mapped[bool]


class AreaName(Base):
    __tablename__ = "area_name"
    __table_args__ = (UniqueConstraint("collection_id", "code"), {"sqlite_strict": True})

    id: Mapped[int] = mapped_column(primary_key=True)
    collection_id: Mapped[int] = mapped_column(ForeignKey("collection.id"))
    code: Mapped[str] = mapped_column(String(32))
    name: Mapped[str]


class BasisRange(Ranged, Base):
    """How the counts were made; one row holds in each edition."""

    __tablename__ = "basis"
    __table_args__ = (*_ranged("basis"), {"sqlite_strict": True})
    KEY: ClassVar = ()

    people: Mapped[str]
    dated_by: Mapped[str]
    population: Mapped[str]
    population_date: Mapped[str]
    source: Mapped[str]
    vintage: Mapped[str] = mapped_column(server_default="")


class BreakRange(Ranged, Base):
    """A dated change that a trend must not cross, or a year of shock."""

    __tablename__ = "break"
    __table_args__ = (
        *_ranged("break", *_BREAK_KEY),
        CheckConstraint(
            "kind IN ('boundary', 'coding', 'definition', 'population', 'shock')", name="kind"
        ),
        {"sqlite_strict": True},
    )
    KEY: ClassVar = _BREAK_KEY

    area: Mapped[str] = mapped_column(String(32))
    period: Mapped[str] = mapped_column(String(32))
    kind: Mapped[str] = mapped_column(String(16))
    cause: Mapped[str] = mapped_column(String(32))
    note: Mapped[str] = mapped_column(Text)
    ratio: Mapped[float | None] = mapped_column(Double)
    ratio_error: Mapped[float | None] = mapped_column(Double)


class CauseRange(Ranged, Base):
    """An entry of the cause list. Its label and place are presentation, in cause_label."""

    __tablename__ = "cause"
    __table_args__ = (
        *_ranged("cause", "code"),
        CheckConstraint(
            "kind IN ('natural', 'external', 'undetermined', 'ill_defined', 'pending',"
            " 'not_underlying')",
            name="kind",
        ),
        {"sqlite_strict": True},
    )
    KEY: ClassVar = ("code",)

    code: Mapped[str] = mapped_column(String(32))
    parent: Mapped[str] = mapped_column(String(32))
    ranges: Mapped[str] = mapped_column(Text)  # codes of the classification, with spaces between
    kind: Mapped[str] = mapped_column(String(16))
    care: Mapped[str] = mapped_column(String(16))
    sex: Mapped[str] = mapped_column(String(1))


class CauseLabel(Base):
    """What a cause is called, and its place in the list."""

    __tablename__ = "cause_label"
    __table_args__ = (UniqueConstraint("collection_id", "code"), {"sqlite_strict": True})

    id: Mapped[int] = mapped_column(primary_key=True)
    collection_id: Mapped[int] = mapped_column(ForeignKey("collection.id"))
    code: Mapped[str] = mapped_column(String(32))
    label: Mapped[str]
    place: Mapped[int]
