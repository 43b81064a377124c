"""What a what-if page is asked: other death rates, spelled wholly in its address."""

import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import ClassVar, Self
from urllib.parse import urlencode

from engine.panel import SEXES
from server.results.causes import CauseChoice
from server.results.keys import (
    CAUSE_KEYS,
    DEFAULT_INDICATOR,
    DEFAULT_SETTINGS,
    BadValue,
    Items,
    Keys,
    PopulationYear,
)
from server.sentences.text import _

PER_ROW = (
    "by",
    "from",
    "to",
    "sex",
    "cause",
)  # keys of one change; the n-th of each belong together
MOST_ROWS = 12
MOST_PERCENT = 900.0
EVERYBODY = "p"
_NUMBER = re.compile(r"[+-]?[0-9]{1,6}(\.[0-9]{1,6})?")
_AGE = re.compile(r"[0-9]{1,3}")


@dataclass(frozen=True, slots=True)
class Where:
    """Ages from one to another, both in completed years, and a cause."""

    first: str = "0"
    last: str = ""  # empty: and over
    cause: str = ""  # code; empty: all causes

    @property
    def everything(self) -> bool:
        return self == Where()


@dataclass(frozen=True, slots=True)
class Row:
    """One change of death rates; without a percentage it only names what a target is sought for."""

    where: Where
    percent: float | None = None
    sex: str = EVERYBODY

    @property
    def blank(self) -> bool:
        """A line of the form that was left as it was."""
        return self.percent is None and self.where.everything and self.sex == EVERYBODY

    @property
    def by(self) -> str:
        """As the address spells the percentage."""
        return "" if self.percent is None else f"{self.percent:.10g}"


@dataclass(frozen=True, slots=True)
class WhatIfQuestion:
    """What would the figures be at other death rates? One area, sex and year."""

    view: ClassVar[str] = "what-if"

    at: PopulationYear
    of: str = DEFAULT_INDICATOR
    rows: tuple[Row, ...] = ()
    toward: PopulationYear | None = None  # whose rates stand in place of own
    toward_where: Where = Where()
    target: str = ""  # of the indicator, in the unit it is printed in
    causes: CauseChoice | None = None
    figures: str = "released"
    settings: str = DEFAULT_SETTINGS

    @classmethod
    def parse(cls, items: Items) -> Self:
        keys = Keys(
            items,
            populations=("at", "toward"),
            once=(
                "of",
                "toward_from",
                "toward_to",
                "toward_cause",
                "target",
                *CAUSE_KEYS,
                "figures",
                "settings",
            ),
            many=PER_ROW,
        )
        at = keys.population("at")
        toward = None
        if keys.one("toward") or keys.one("toward_area"):
            toward = keys.population("toward")
        lent = _where(
            keys, "toward_", *(keys.one(f"toward_{key}") for key in ("from", "to", "cause"))
        )
        return cls(
            at,
            keys.indicator(),
            _rows(keys, at),
            toward,
            lent if toward else Where(),
            _target(keys),
            keys.causes(),
            keys.figures(),
            keys.settings(),
        )

    def canonical(self) -> str:
        pairs = [("at", self.at.code), ("of", self.of)]
        for row in self.rows:
            found = (row.by, row.where.first, row.where.last, row.sex, row.where.cause)
            pairs += zip(PER_ROW, found, strict=True)
        if self.toward:
            where = self.toward_where
            pairs += [("toward", self.toward.code), ("toward_from", where.first)]
            pairs += [("toward_to", where.last), ("toward_cause", where.cause)]
        pairs += [("target", self.target)] if self.target else []
        pairs += self.causes.pairs if self.causes else []
        return urlencode([*pairs, ("figures", self.figures), ("settings", self.settings)])

    @property
    def changes(self) -> tuple[Row, ...]:
        """The rows that change anything."""
        return tuple(row for row in self.rows if row.percent is not None)

    @property
    def named(self) -> tuple[str, ...]:
        """The causes it names."""
        codes = [row.where.cause for row in self.rows]
        codes += [self.toward_where.cause] if self.toward else []
        return tuple(code for code in dict.fromkeys(codes) if code)


def _rows(keys: Keys, at: PopulationYear) -> tuple[Row, ...]:
    columns = {key: keys.all(key) for key in PER_ROW}
    count = max(len(column) for column in columns.values())
    for key, column in columns.items():
        if len(column) not in (0, count):
            raise BadValue(
                _(
                    "Each change has the keys {keys}, in this order; the key “{key}” stands {found}"
                    " times where another stands {count} times. Give each change all of them, empty"
                    " where nothing is chosen.",
                    keys=", ".join(PER_ROW),
                    key=key,
                    found=len(column),
                    count=count,
                )
            )
    if count > MOST_ROWS:
        raise BadValue(
            _(
                "The address has {count} changes; a page works out up to {most}. Leave some out.",
                count=count,
                most=MOST_ROWS,
            )
        )
    filled = [column or [""] * count for column in columns.values()]
    rows = (_row(keys, at, texts) for texts in zip(*filled, strict=True))
    return tuple(row for row in rows if not row.blank)


def _row(keys: Keys, at: PopulationYear, texts: Sequence[str]) -> Row:
    by, first, last, sex, cause = texts
    whose = keys.choice("sex", sex or EVERYBODY, SEXES)
    if at.sex != EVERYBODY:
        if whose not in (EVERYBODY, at.sex):
            raise BadValue(
                _(
                    "The figures are those of {code}, but a change is of another sex"
                    " (“sex={sex}”). Choose persons in “at”, or leave “sex” empty.",
                    code=at.code,
                    sex=whose,
                )
            )
        whose = EVERYBODY
    return Row(_where(keys, "", first, last, cause), _percent(by), whose)


def _where(keys: Keys, prefix: str, first: str, last: str, cause: str) -> Where:
    for key, age in (("from", first), ("to", last)):
        if age and not _AGE.fullmatch(age):
            raise BadValue(
                _(
                    "The key “{key}” has the value “{found}”; an age is a whole number of completed"
                    " years.",
                    key=f"{prefix}{key}",
                    found=age,
                )
            )
    begin, end = str(int(first or "0")), str(int(last)) if last else ""
    if end and int(end) < int(begin):
        raise BadValue(
            _(
                "The ages run from {first} to {last}: the first lies above the last. Exchange the"
                " two.",
                first=begin,
                last=end,
            )
        )
    return Where(begin, end, keys.code(f"{prefix}cause", cause) if cause else "")


def _percent(text: str) -> float | None:
    """−20, -20 %, +5 or nothing."""
    bare = text.replace("\N{MINUS SIGN}", "-").replace("%", "").strip()
    if not bare:
        return None
    if not _NUMBER.fullmatch(bare) or not -100 <= float(bare) <= MOST_PERCENT:
        raise BadValue(
            _(
                "The key “by” has the value “{found}”; it takes by how many per cent death rates"
                " change, from -100 (nobody dies) to {most}, for example -20.",
                found=text,
                most=f"{MOST_PERCENT:g}",
            )
        )
    return float(bare) or 0.0


def _target(keys: Keys) -> str:
    text = keys.one("target").replace("\N{MINUS SIGN}", "-").strip()
    if text and not _NUMBER.fullmatch(text):
        raise BadValue(
            _(
                "The key “target” has the value “{found}”; it takes a number in the unit of the"
                " figure, for example 80.5.",
                found=text,
            )
        )
    return f"{float(text):.10g}" if text else ""
