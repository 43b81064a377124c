"""Questions: what an address asks, read from its keys, and the one spelling it is pinned under.

A question knows nothing of a database. What a form leaves out (areas, sexes, years of a trend) is
filled in from what an edition holds by `completed`; the route then redirects to the full spelling.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import ClassVar, Protocol, Self
from urllib.parse import urlencode

from engine.panel import SEXES
from engine.settings import find as find_settings
from engine.standards.remaining_years import REFERENCES
from server.results.causes import CauseChoice
from server.results.keys import (
    CAUSE_KEYS,
    CODE,
    DEFAULT_INDICATOR,
    DEFAULT_SETTINGS,
    FIGURES,
    BadAddress,
    BadValue,
    Items,
    Keys,
    PopulationYear,
    UnknownKey,
)
from server.sentences.text import _

OVERLAPS = ("shared", "rest")  # the first is what an address without the key means

__all__ = [
    "CODE",
    "DEFAULT_INDICATOR",
    "DEFAULT_SETTINGS",
    "FIGURES",
    "OVERLAPS",
    "BadAddress",
    "BadValue",
    "CausesQuestion",
    "ComparisonQuestion",
    "CurvesQuestion",
    "Items",
    "Keys",
    "PopulationYear",
    "PopulationYearQuestion",
    "Question",
    "TrendQuestion",
    "UnknownKey",
    "address",
]


class Question(Protocol):
    """What all views' questions share."""

    view: ClassVar[str]

    @property
    def figures(self) -> str:
        """As released, or in full."""

    @property
    def settings(self) -> str:
        """Name of the settings."""

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
class CurvesQuestion(PopulationYearQuestion):
    """Which curve lies behind the death rates? One area, sex and year."""

    view: ClassVar[str] = "curves"


@dataclass(frozen=True, slots=True)
class CausesQuestion:
    """Of what do people die here? One area, sex and year; one cause is followed through the years,
    and deaths before 75 of those counted as avoidable are added up."""

    view: ClassVar[str] = "causes"

    of: PopulationYear
    cause: str = ""  # code of the one followed; empty: the one that costs most
    avoidable: tuple[str, ...] = ()  # codes of those the reader counts as avoidable
    causes: CauseChoice | None = None  # how deaths by cause are shown; None: not spelled
    figures: str = "released"
    settings: str = DEFAULT_SETTINGS

    @classmethod
    def parse(cls, items: Items) -> Self:
        once = ("cause", *CAUSE_KEYS, "figures", "settings")
        keys = Keys(items, populations=("of",), once=once, many=("avoidable",))
        avoidable = {keys.code("avoidable", text) for text in keys.all("avoidable")}
        return cls(
            keys.population("of"),
            keys.code("cause", found) if (found := keys.one("cause")) else "",
            tuple(sorted(avoidable)),
            keys.causes(),
            keys.figures(),
            keys.settings(),
        )

    def completed(self) -> Self:
        """With the choices that an address left out."""
        return replace(self, causes=self.causes or CauseChoice())

    def canonical(self) -> str:
        pairs = [("of", self.of.code)]
        pairs += [("cause", self.cause)] if self.cause else []
        pairs += [("avoidable", code) for code in self.avoidable]
        pairs += self.causes.pairs if self.causes else []
        return urlencode([*pairs, ("figures", self.figures), ("settings", self.settings)])


@dataclass(frozen=True, slots=True)
class ComparisonQuestion:
    """What lies between these two? The difference is this less that.

    That stands in the same edition, in another one of its own or of another collection, or is a
    printed table. `overlap`: where the one lies in the other, it is set against the whole, deaths
    in both counted once, or against the rest of it.
    """

    view: ClassVar[str] = "comparison"

    this: PopulationYear
    that: PopulationYear  # this itself where a printed table takes its place
    of: str = DEFAULT_INDICATOR
    figures: str = "released"
    settings: str = DEFAULT_SETTINGS
    overlap: str = OVERLAPS[0]
    that_collection: str = ""  # code; empty: the same
    that_edition: int = 0  # number; 0: the same, or the newest one that stands elsewhere
    standard: str = ""  # key of the printed table; empty: none
    causes: CauseChoice | None = None  # how deaths by cause are shown; None: not spelled

    @classmethod
    def parse(cls, items: Items) -> Self:
        once = ("that_collection", "that_edition", "standard", "of", "overlap", *CAUSE_KEYS)
        keys = Keys(items, populations=("this", "that"), once=(*once, "figures", "settings"))
        this = keys.population("this")
        standard = keys.choice("standard", keys.one("standard"), ("", *REFERENCES))
        return cls(
            this,
            this if standard else keys.population("that"),
            keys.compared(),
            keys.figures(),
            keys.settings(),
            keys.choice("overlap", keys.one("overlap", OVERLAPS[0]), OVERLAPS),
            "" if standard else keys.collection("that_collection"),
            0 if standard else keys.edition("that_edition"),
            standard,
            keys.causes(),
        ).simplified()

    def simplified(self) -> Self:
        """Without a choice that can make no difference: there is a rest of an area only beside its
        own sex in the same years."""
        own = not (self.standard or self.that_collection or self.that_edition)
        years = find_settings(self.settings).years
        near = abs(int(self.this.period) - int(self.that.period)) < years
        one_in_other = self.this.area != self.that.area and self.this.sex == self.that.sex
        return self if own and near and one_in_other else replace(self, overlap=OVERLAPS[0])

    def canonical(self) -> str:
        pairs = [("this", self.this.code)]
        pairs += [("that", self.that.code)] if not self.standard else []
        pairs += [("that_collection", self.that_collection)] if self.that_collection else []
        pairs += [("that_edition", str(self.that_edition))] if self.that_edition else []
        pairs += [("standard", self.standard)] if self.standard else []
        pairs += [("of", self.of)]
        pairs += [("overlap", self.overlap)] if self.overlap != OVERLAPS[0] else []
        pairs += self.causes.pairs if self.causes else []
        return urlencode([*pairs, ("figures", self.figures), ("settings", self.settings)])

    def exchanged(self) -> Self:
        """The same from the other side, where both stand in one edition."""
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
