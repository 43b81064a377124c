"""The words used on the pages, in plain language."""

from dataclasses import dataclass
from typing import ClassVar

from engine.causes.registry import NUMBERS
from engine.indicators import GROUPS
from server.exports.table import GapKind
from server.pages.page import Frame, Page
from server.sentences import names
from server.sentences import words as say
from server.sentences.pieces import phrase
from server.sentences.text import _

Entries = tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class WordsPage(Page):
    """What does this word mean?"""

    template: ClassVar[str] = "words/page.html"
    groups: tuple[tuple[str, Entries], ...]  # heading, and words with their meanings
    marks: tuple[tuple[GapKind, str, str], ...]  # its name, its meaning


def build() -> WordsPage:
    figures = tuple(
        (
            _("Figures: {group}", group=names.inside(_(group.label))),
            tuple((_(one.label), _(one.definition)) for one in group.indicators),
        )
        for group in GROUPS
    )
    return WordsPage(
        frame=Frame(
            title=_("Words"),
            address="/words",
            locator=phrase(_("The words used on these pages")),
            nav="words",
        ),
        answer=phrase(_("Every word that a page uses in a sense of its own is explained here.")),
        groups=(
            (_("What is counted"), say.counting()),
            (_("How it is read"), say.reading()),
            (_("How it is compared"), say.comparing()),
            (_("What stands in for counts"), say.modelling()),
            *figures,
            (
                _("Figures by cause of death"),
                tuple((_(one.label), _(one.definition)) for one in NUMBERS.values()),
            ),
        ),
        marks=tuple((GapKind(kind), name, meaning) for kind, name, meaning in say.marks()),
    )
