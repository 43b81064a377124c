"""Why a figure reads differently now than in an earlier edition or under other settings: the
difference parted exactly among deaths, population, mapping and settings."""

import math
from dataclasses import dataclass
from typing import ClassVar, Self
from urllib.parse import urlencode

from engine import indicators
from engine import settings as named
from engine.indicators import Indicator
from server.results.changes import since
from server.results.holdings import Holdings, holdings
from server.results.keys import (
    DEFAULT_INDICATOR,
    DEFAULT_SETTINGS,
    BadValue,
    Items,
    Keys,
    PopulationYear,
)
from server.results.mixing import Sides, part_of
from server.results.shares import Shares, shares
from server.sentences.text import _
from server.store import areas, editions
from server.store.connect import Session
from server.store.errors import Missing
from server.store.heading import Heading
from server.store.records import Edition


@dataclass(frozen=True, slots=True)
class AccountQuestion:
    """Why does this figure read differently? `since` 0: since the edition this one was built on."""

    view: ClassVar[str] = "account"

    at: PopulationYear
    since: int = 0
    of: str = DEFAULT_INDICATOR
    figures: str = "released"
    settings: str = DEFAULT_SETTINGS
    settings_then: str = ""
    printed: str = ""  # what was printed then, as printed; empty: nothing is kept

    @classmethod
    def parse(cls, items: Items) -> Self:
        keys = Keys(
            items,
            populations=("at",),
            once=("of", "since", "figures", "settings", "settings_then", "printed"),
        )
        settings = keys.settings()
        then = keys.one("settings_then", settings)
        return cls(
            keys.population("at"),
            since(keys),
            keys.indicator(),
            keys.figures(),
            settings,
            keys.choice("settings_then", then, tuple(named.SETTINGS)),
            _printed(keys.one("printed")),
        )

    def canonical(self) -> str:
        pairs: list[tuple[str, object]] = [
            ("of", self.of),
            ("at", self.at.code),
            ("since", self.since),
            ("figures", self.figures),
            ("settings", self.settings),
            ("settings_then", self.settings_then or self.settings),
        ]
        return urlencode(pairs + ([("printed", self.printed)] if self.printed else []))


def _printed(text: str) -> str:
    """A number as it may have been printed. BadValue."""
    try:
        known = not text or math.isfinite(float(text))
    except ValueError:
        known = False
    if not known or len(text) > 32:
        raise BadValue(
            _(
                "The key “printed” has the value “{text}”; it takes a number, such as 81.4.",
                text=text,
            )
        )
    return text


@dataclass(frozen=True, slots=True)
class Account:
    """A figure then and now, in the engine's unit, and what moved it."""

    heading: Heading
    question: AccountQuestion
    then: Edition
    holdings: Holdings
    indicator: Indicator
    before: float  # the earlier edition under the settings then; nan: cannot be given
    after: float
    parts: tuple[str, ...]  # those that differ, in the order of PARTS
    shares: Shares | None  # None where the difference cannot be parted

    @property
    def printed(self) -> float:
        """What was printed then; nan where nothing is kept."""
        text = self.question.printed
        return float(text) / self.indicator.unit.scale if text else math.nan

    @property
    def astray(self) -> float:
        """By how much the figure then, worked out today, differs from the one printed: an older
        engine, or rounding."""
        return self.before - self.printed

    @property
    def difference(self) -> float:
        return self.after - (self.printed if self.question.printed else self.before)


def account(session: Session, heading: Heading, question: AccountQuestion) -> Account:
    """Missing, NotInEdition, BadValue. A dozen statements; one engine call a grid and settings."""
    code, now = heading.collection.code, heading.edition.number
    then = _then(session, heading, question)
    held = holdings(session, code, now)
    trees = (areas.listing(session, code, then.number), held.areas)
    sides = Sides.loaded(session, code, (then.number, now), trees, question)
    kinds = part_of(session, code, sides)
    parts = sides.parts(kinds)
    values = sides.values(parts, kinds)
    everything = frozenset(parts)
    if math.isnan(values[everything]) and question.at not in held.status:
        raise held.lacks(question.at, named.find(question.settings).years)
    return Account(
        heading=heading,
        question=question,
        then=then,
        holdings=held,
        indicator=indicators.find(question.of),
        before=values[frozenset()],
        after=values[everything],
        parts=parts,
        shares=shares(values, parts),
    )


def _then(session: Session, heading: Heading, question: AccountQuestion) -> Edition:
    number = question.since or heading.edition.base or heading.edition.number
    found = editions.find(session, heading.collection.code, number)
    if found is None:
        known = [one.number for one in editions.listing(session, heading.collection.code)]
        raise Missing("edition", number, known)
    return found
