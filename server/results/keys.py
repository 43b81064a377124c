"""The keys of an address: each read, or refused in a sentence that says what can be read."""

import re
from collections import Counter
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Self

from engine import indicators, settings
from engine.panel import SEXES
from server.results.causes import CauseChoice
from server.sentences.text import _

CODE = re.compile(r"[A-Za-z0-9_.-]{1,32}")
PERIOD = re.compile(r"[0-9]{4}")
FIGURES = ("released", "full")
CAUSE_KEYS = tuple(CauseChoice.VALUES)  # in an address before `figures`
DEFAULT_SETTINGS = "almanac-1"
DEFAULT_INDICATOR = "e0"

Items = Iterable[tuple[str, str]]


class BadAddress(ValueError):
    """An address that cannot be read; its text says what was found and what is known."""


class UnknownKey(BadAddress):
    """A key the view does not know."""


class BadValue(BadAddress):
    """A key doubled, missing or with a value that cannot be read."""


@dataclass(frozen=True, slots=True, order=True)
class PopulationYear:
    """An area, sex and year: what a life table is made for."""

    area: str
    sex: str
    period: str

    @property
    def code(self) -> str:
        return f"{self.area}.{self.sex}.{self.period}"

    @classmethod
    def parse(cls, text: str) -> Self:
        """Read from the right, since an area's code may hold points.

        >>> PopulationYear.parse("st.john.f.2014")
        PopulationYear(area='st.john', sex='f', period='2014')
        """
        parts = text.rsplit(".", 2)
        if len(parts) == 3:
            area, sex, period = parts
            if CODE.fullmatch(area) and sex in SEXES and PERIOD.fullmatch(period):
                return cls(area, sex, period)
        raise BadValue(
            _(
                "“{text}” is not an area, sex and year. It is written as area.sex.year with the sex"
                " f, m or p, for example north.f.2014.",
                text=text,
            )
        )


PARTS = ("area", "sex", "period")


class Keys:
    """The keys of one address, each refused in a sentence where it cannot be read.

    A population-year may also be given in three keys (of_area, of_sex, of_period), so that a plain
    form can ask for it.
    """

    def __init__(
        self,
        items: Items,
        *,
        populations: tuple[str, ...] = (),
        once: tuple[str, ...] = (),
        many: tuple[str, ...] = (),
    ) -> None:
        self._items = list(items)
        parts = tuple(f"{key}_{part}" for key in populations for part in PARTS)
        known = (*populations, *many, *once)
        counts = Counter(key for key, _text in self._items)
        for key in counts:
            if key not in (*known, *parts):
                raise UnknownKey(
                    _(
                        "The address has the key “{key}”, which this page does not know. It knows"
                        " {known}. Remove it or correct its spelling.",
                        key=key,
                        known=", ".join(known),
                    )
                )
            if counts[key] > 1 and key not in many:
                raise BadValue(
                    _(
                        "The address has the key “{key}” {count} times; it may stand once. Remove"
                        " all but one.",
                        key=key,
                        count=counts[key],
                    )
                )

    def all(self, key: str) -> list[str]:
        return [text for name, text in self._items if name == key]

    def one(self, key: str, default: str = "") -> str:
        return (self.all(key) or [default])[0]

    def population(self, key: str) -> PopulationYear:
        parts = [self.one(f"{key}_{part}") for part in PARTS]
        whole = self.one(key)
        if whole and any(parts):
            raise BadValue(
                _(
                    "The address gives “{key}” both whole and in parts. Keep one of the two.",
                    key=key,
                )
            )
        if whole or all(parts):
            return PopulationYear.parse(whole or ".".join(parts))
        raise BadValue(
            _(
                "The address lacks the key “{key}”, the area, sex and year asked for. Add it, for"
                " example {key}=north.f.2014.",
                key=key,
            )
        )

    def choice(self, key: str, found: str, known: Sequence[str]) -> str:
        if found not in known:
            raise BadValue(
                _(
                    "The key “{key}” has the value “{found}”; it can be {known}.",
                    key=key,
                    found=found,
                    known=", ".join(known),
                )
            )
        return found

    def code(self, key: str, found: str) -> str:
        if not CODE.fullmatch(found):
            raise BadValue(
                _(
                    "The key “{key}” has the value “{found}”; a code has 1 to 32 letters, digits,"
                    " points, hyphens or underscores.",
                    key=key,
                    found=found,
                )
            )
        return found

    def year(self, key: str) -> str:
        found = self.one(key)
        if found and not PERIOD.fullmatch(found):
            raise BadValue(
                _(
                    "The key “{key}” has the value “{found}”; a year has four digits, for example"
                    " 2014.",
                    key=key,
                    found=found,
                )
            )
        return found

    def causes(self) -> CauseChoice | None:
        """How deaths by cause are shown; None where the address says nothing of it."""
        if not any(self.one(key) for key in CAUSE_KEYS):
            return None
        values = (
            self.choice(key, self.one(key) or known[0], known)
            for key, known in CauseChoice.VALUES.items()
        )
        return CauseChoice(*values)

    def collection(self, key: str) -> str:
        """The code of another collection; empty where the address gives none."""
        return self.code(key, found) if (found := self.one(key)) else ""

    def edition(self, key: str) -> int:
        """The number of another edition; 0 where the address gives none."""
        text = self.one(key)
        if text and not (text.isascii() and text.isdecimal() and len(text) < 10 and int(text)):
            raise BadValue(
                _(
                    "The key “{key}” has the value “{text}”; it takes the number of an edition,"
                    " for example {key}=1.",
                    key=key,
                    text=text,
                )
            )
        return int(text or 0)

    def figures(self) -> str:
        return self.choice("figures", self.one("figures", FIGURES[0]), FIGURES)

    def settings(self) -> str:
        return self.choice(
            "settings", self.one("settings", DEFAULT_SETTINGS), tuple(settings.SETTINGS)
        )

    def compared(self) -> str:
        """An indicator of which two may be set against one another."""
        found = self.indicator()
        if indicators.find(found).needs.whole:
            raise BadValue(
                _(
                    "“{of}” sets an area against the larger one it is part of, weighted by its own"
                    " people: two of them do not compare. Choose a standardised death rate, for"
                    " example asr_esp2013.",
                    of=found,
                )
            )
        return found

    def indicator(self) -> str:
        found = self.one("of", DEFAULT_INDICATOR)
        try:
            return indicators.find(found).key
        except ValueError:
            known = (*indicators.INDICATORS, *(one.example for one in indicators.PATTERNS))
            return self.choice("of", found, known)
