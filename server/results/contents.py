"""What an edition holds, and life expectancy at birth of every area in its newest year."""

from dataclasses import dataclass
from typing import ClassVar, Self
from urllib.parse import urlencode

from server.results.holdings import Holdings, holdings
from server.results.questions import DEFAULT_SETTINGS, Items, Keys, TrendQuestion
from server.results.series import Series, series
from server.store.connect import Session
from server.store.heading import Heading


@dataclass(frozen=True, slots=True)
class ContentsQuestion:
    """What is in this edition?"""

    view: ClassVar[str] = "contents"

    figures: str = "released"
    settings: str = DEFAULT_SETTINGS

    @classmethod
    def parse(cls, items: Items) -> Self:
        keys = Keys(items, once=("figures", "settings"))
        return cls(keys.figures(), keys.settings())

    def canonical(self) -> str:
        return urlencode([("figures", self.figures), ("settings", self.settings)])


@dataclass(frozen=True, slots=True)
class Contents:
    """`newest` has one line an area and sex, and the newest year alone; None: nothing is held."""

    heading: Heading
    question: ContentsQuestion
    holdings: Holdings
    newest: Series | None


def contents(session: Session, heading: Heading, question: ContentsQuestion) -> Contents:
    """Life expectancy at birth of women and men (or whoever is held) of all areas."""
    held = holdings(session, heading.collection.code, heading.edition.number)
    if not held.periods:
        return Contents(heading, question, held, None)
    asked = TrendQuestion(
        areas=tuple(area.code for area in held.areas),
        first=held.periods[-1],
        figures=question.figures,
        settings=question.settings,
    ).completed(areas=(), sexes=held.sexes, periods=held.periods)
    return Contents(heading, question, held, series(session, heading, asked, held))
