"""Questions: what an address asks, read from its keys, and the one spelling it is pinned under.

A question knows nothing of a database. What a form leaves out (areas, sexes, years of a trend) is
filled in from what an edition holds by `completed`; the route then redirects to the full spelling.
"""

import re
from collections import Counter
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from typing import ClassVar, Protocol, Self
from urllib.parse import urlencode

from engine import indicators, settings
from engine.panel import SEXES
from server.sentences.text import _

CODE = re.compile(r"[A-Za-z0-9_.-]{1,32}")
PERIOD = re.compile(r"[0-9]{4}")
FIGURES = ("released", "full")
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


class Question(Protocol):
    """What all views' questions share."""

    view: ClassVar[str]

    @classmethod
    def parse(cls, items: Items) -> Self:
        """From the keys of an address; UnknownKey, BadValue."""

    def canonical(self) -> str:
        """The query, every choice spelled, in the view's one order."""


@dataclass(frozen=True, slots=True)
class PopulationYearQuestion:
    """How long do people live here? One area, sex and year."""

    view: ClassVar[str] = "population-year"

    of: PopulationYear
    figures: str = "released"
    settings: str = DEFAULT_SETTINGS

    @classmethod
    def parse(cls, items: Items) -> Self:
        keys = Keys(items, populations=("of",), once=("figures", "settings"))
        return cls(keys.population("of"), keys.figures(), keys.settings())

    def canonical(self) -> str:
        return urlencode(
            [("of", self.of.code), ("figures", self.figures), ("settings", self.settings)]
        )


@dataclass(frozen=True, slots=True)
class ComparisonQuestion:
    """What lies between these two? The difference is this less that."""

    view: ClassVar[str] = "comparison"

    this: PopulationYear
    that: PopulationYear
    of: str = DEFAULT_INDICATOR
    figures: str = "released"
    settings: str = DEFAULT_SETTINGS

    @classmethod
    def parse(cls, items: Items) -> Self:
        keys = Keys(items, populations=("this", "that"), once=("of", "figures", "settings"))
        return cls(
            keys.population("this"),
            keys.population("that"),
            keys.indicator(),
            keys.figures(),
            keys.settings(),
        )

    def canonical(self) -> str:
        return urlencode(
            [
                ("this", self.this.code),
                ("that", self.that.code),
                ("of", self.of),
                ("figures", self.figures),
                ("settings", self.settings),
            ]
        )

    def exchanged(self) -> Self:
        return replace(self, this=self.that, that=self.this)


@dataclass(frozen=True, slots=True)
class TrendQuestion:
    """Which way is it going? One indicator through the years. Empty parts were not spelled."""

    view: ClassVar[str] = "trend"

    of: str = DEFAULT_INDICATOR
    areas: tuple[str, ...] = ()
    sexes: tuple[str, ...] = ()
    first: str = ""
    last: str = ""
    figures: str = "released"
    settings: str = DEFAULT_SETTINGS

    @classmethod
    def parse(cls, items: Items) -> Self:
        keys = Keys(
            items,
            once=("of", "from", "to", "figures", "settings"),
            many=("area", "sex"),
        )
        areas = tuple(keys.code("area", text) for text in keys.all("area"))
        sexes = tuple(keys.choice("sex", text, SEXES) for text in keys.all("sex"))
        first, last = keys.year("from"), keys.year("to")
        if first and last and first > last:
            raise BadValue(
                _(
                    "The years run from {first} to {last}: the first lies after the last. Exchange"
                    " the two.",
                    first=first,
                    last=last,
                )
            )
        return cls(
            keys.indicator(),
            tuple(sorted(set(areas))),
            tuple(sex for sex in SEXES if sex in sexes),
            first,
            last,
            keys.figures(),
            keys.settings(),
        )

    def completed(
        self, *, areas: Sequence[str], sexes: Sequence[str], periods: Sequence[str]
    ) -> Self:
        """What was not spelled, filled in: the first of `areas` (in tree order, the whole), women
        and men (or whoever is held), all years."""
        both = tuple(sex for sex in ("f", "m") if sex in sexes) or tuple(sexes)[:1]
        return replace(
            self,
            areas=self.areas or tuple(areas[:1]),
            sexes=self.sexes or both,
            first=self.first or min(periods),
            last=self.last or max(periods),
        )

    def canonical(self) -> str:
        pairs = [("of", self.of)]
        pairs += [("area", area) for area in self.areas]
        pairs += [("sex", sex) for sex in self.sexes]
        pairs += [("from", self.first)] if self.first else []
        pairs += [("to", self.last)] if self.last else []
        return urlencode([*pairs, ("figures", self.figures), ("settings", self.settings)])

    @property
    def series(self) -> tuple[tuple[str, str], ...]:
        """The (area, sex) of each line, in canonical order."""
        return tuple((area, sex) for area in self.areas for sex in self.sexes)


def address(
    collection: str, edition: int, question: Question, *, twin: str = "", table: str = ""
) -> str:
    """Where a question is answered; `twin` is csv, xlsx or json, `table` the one a CSV holds."""
    suffix = f".{twin}" if twin else ""
    chosen = f"&{urlencode({'table': table})}" if table else ""
    return f"/c/{collection}/{edition}/{question.view}{suffix}?{question.canonical()}{chosen}"


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

    def figures(self) -> str:
        return self.choice("figures", self.one("figures", FIGURES[0]), FIGURES)

    def settings(self) -> str:
        return self.choice(
            "settings", self.one("settings", DEFAULT_SETTINGS), tuple(settings.SETTINGS)
        )

    def indicator(self) -> str:
        found = self.one("of", DEFAULT_INDICATOR)
        try:
            return indicators.find(found).key
        except ValueError:
            known = (*indicators.INDICATORS, "e80")
            return self.choice("of", found, known)
