"""No words in a template but through the catalogue."""

import re
from html.parser import HTMLParser

import jinja2
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


def _plain(source: nodes.Node) -> str:
    """The template's own text; a sign stands where an expression prints."""
    return "".join(
        part.data if isinstance(part, nodes.TemplateData) else "\u0000"
        for output in source.find_all(nodes.Output)
        for part in output.nodes
    )


def bare_words(source: nodes.Template) -> set[str]:
    """Words that stand in the template itself, page and macros each for itself. A macro without
    any tag prints a part of one, such as the value of a class: that is not read by people."""
    macros = list(source.find_all(nodes.Macro))
    pieces = [text for text in map(_plain, macros) if "<" in text]
    source.body = [node for node in source.body if node not in macros]
    found: list[str] = []
    for piece in (_plain(source), *pieces):
        reader = _Words()
        reader.feed(piece)
        found += reader.found
    return {word for text in found for word in re.findall(r"[^\W\d_]{2,}", text)} - NAMES


@pytest.mark.parametrize("name", TEMPLATES)
def test_a_template_has_no_words_of_its_own(name: str) -> None:
    assert bare_words(parsed(name)) == set(), "write {{ _(...) }}"


def test_a_bare_word_is_found_in_text_and_in_what_is_read_aloud() -> None:
    source = jinja2.Environment().parse(
        """<p class="quiet">{{ _("said") }} Deaths <img alt="Curve" src="x.svg"></p>
        {% macro width() %}whole{% endmacro %}{% macro row() %}<td>Sum</td>{% endmacro %}"""
    )
    assert bare_words(source) == {"Deaths", "Curve", "Sum"}
