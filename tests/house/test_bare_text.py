"""No words in a template but through the catalogue."""

import re
from html.parser import HTMLParser

import pytest
from jinja2 import nodes

from tests.house.test_templates import TEMPLATES, parsed

pytestmark = pytest.mark.house

NAMES = {"Ebbline", "html", "csv", "xlsx", "json"}  # the same in every language
READ_ALOUD = {"alt", "aria-label", "aria-description", "placeholder", "title", "data-h"}


class _Words(HTMLParser):
    """Text between tags and in attributes that people read or hear."""

    def __init__(self) -> None:
        super().__init__()
        self.found: list[str] = []
        self._silent = False

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self._silent = tag in ("script", "style")
        self.found += [text or "" for name, text in attrs if name in READ_ALOUD]

    def handle_endtag(self, tag: str) -> None:
        self._silent = False

    def handle_data(self, data: str) -> None:
        if not self._silent:
            self.found.append(data)


def bare_words(source: nodes.Template) -> set[str]:
    """Words that stand in the template itself; what an expression prints is left out."""
    plain = "".join(
        part.data if isinstance(part, nodes.TemplateData) else "\u0000"
        for output in source.find_all(nodes.Output)
        for part in output.nodes
    )
    reader = _Words()
    reader.feed(plain)
    return {word for text in reader.found for word in re.findall(r"[^\W\d_]{2,}", text)} - NAMES


@pytest.mark.parametrize("name", TEMPLATES)
def test_a_template_has_no_words_of_its_own(name: str) -> None:
    assert bare_words(parsed(name)) == set(), "write {{ _(...) }}"
