"""What every table stands on: names of constraints, types of columns on both databases."""

import datetime as dt
from typing import ClassVar

from sqlalchemy import Boolean, Date, DateTime, Double, MetaData, String, Text
from sqlalchemy.engine import Dialect
from sqlalchemy.ext.compiler import compiles
from sqlalchemy.orm import DeclarativeBase
from sqlalchemy.types import TypeDecorator

# SQLite's STRICT tables take only INT, INTEGER, REAL, TEXT, BLOB and ANY as types of a column
_STRICT = {
    String: "TEXT",
    Text: "TEXT",
    Date: "TEXT",
    DateTime: "TEXT",
    Boolean: "INTEGER",
    Double: "REAL",
}
for _type, _name in _STRICT.items():
    compiles(_type, "sqlite")(lambda _element, _compiler, _name=_name, **_kw: _name)

# every constraint has a name, so that a later migration can drop it on either database
NAMES = {
    "ix": "ix_%(column_0_label)s",
    "uq": "uq_%(table_name)s_%(column_0_name)s",
    "ck": "ck_%(table_name)s_%(constraint_name)s",
    "fk": "fk_%(table_name)s_%(column_0_name)s_%(referred_table_name)s",
    "pk": "pk_%(table_name)s",
}


LARGEST = 2**31 - 1  # of an integer column; PostgreSQL refuses even to look for a larger number


class Utc(TypeDecorator[dt.datetime]):
    """A moment in UTC, aware on both databases (SQLite forgets the zone). Refuses a naive one."""

    impl = DateTime(timezone=True)
    cache_ok = True

    def process_bind_param(self, value: dt.datetime | None, dialect: Dialect) -> dt.datetime | None:
        if value is not None and value.tzinfo is None:
            raise ValueError(f"{value} has no time zone; give a moment in UTC")
        return value.astimezone(dt.UTC) if value else None

    def process_result_value(
        self, value: dt.datetime | None, dialect: Dialect
    ) -> dt.datetime | None:
        if value is None:
            return None
        return value.astimezone(dt.UTC) if value.tzinfo else value.replace(tzinfo=dt.UTC)


class Base(DeclarativeBase):
    metadata = MetaData(naming_convention=NAMES)
    type_annotation_map: ClassVar = {dt.datetime: Utc()}
