"""The first page of an empty almanac: what this is and what to do next."""

from dataclasses import dataclass
from typing import ClassVar

from server.pages.page import Frame, Page
from server.sentences import start as say
from server.sentences.pieces import Sentence, phrase
from server.sentences.text import _


@dataclass(frozen=True, slots=True, kw_only=True)
class StartPage(Page):
    """What to do where nothing has been uploaded yet."""

    template: ClassVar[str] = "start/page.html"
    steps: tuple[Sentence, ...]
    questions: tuple[tuple[str, str], ...]


def build() -> StartPage:
    return StartPage(
        frame=Frame(
            title=_("Begin"),
            address="/",
            locator=phrase(_("No collection yet")),
            shown=_("This computer only"),
        ),
        answer=say.answer(),
        lead=(say.lead(),),
        steps=say.steps(),
        questions=say.questions(),
    )
