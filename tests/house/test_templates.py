"""A template places what its page holds: nothing missing, nothing dead, nothing computed."""

import dataclasses
import importlib
import pkgutil

import jinja2
import pytest
from jinja2 import nodes

import server.pages
from server.pages.page import Page
from tests.house.tree import ROOT, files

pytestmark = pytest.mark.house

TEMPLATES = {
    path.relative_to(ROOT / "templates").as_posix(): path
    for path in files("templates", suffix=".html")
}
SHARED = {field.name for field in dataclasses.fields(Page)}


def page_classes() -> list[type[Page]]:
    """Every page there is: the dataclasses with a template in the modules of server/pages."""
    modules = [
        importlib.import_module(f"server.pages.{module.name}")
        for module in pkgutil.iter_modules(server.pages.__path__)
    ]
    found = {
        kind
        for module in modules
        for kind in vars(module).values()
        if isinstance(kind, type) and issubclass(kind, Page) and "template" in vars(kind)
    }
    return sorted(found, key=lambda page: page.__name__)


def parsed(name: str) -> nodes.Template:
    return jinja2.Environment().parse(TEMPLATES[name].read_text(encoding="utf-8"))


def names_of_page(name: str) -> set[str]:
    """Every `page.x` in the template."""
    return {
        found.attr
        for found in parsed(name).find_all(nodes.Getattr)
        if isinstance(found.node, nodes.Name) and found.node.name == "page"
    }


@pytest.mark.parametrize("page", page_classes(), ids=lambda page: page.__name__)
def test_a_template_and_its_page_name_the_same_things(page: type[Page]) -> None:
    own = {field.name for field in dataclasses.fields(page)} - SHARED
    properties = {
        name
        for kind in page.__mro__[:-1]
        for name, value in vars(kind).items()
        if isinstance(value, property)
    }
    used = names_of_page(page.template)
    assert used - SHARED - properties - own == set(), "the template asks for what the page lacks"
    assert own - used == set(), "the page holds what its template never shows"


def test_every_template_belongs_to_a_page_or_to_the_frame() -> None:
    of_pages = {page.template for page in page_classes()}
    assert of_pages <= TEMPLATES.keys()
    loose = {name for name in TEMPLATES.keys() - of_pages if not name.startswith("ui/")}
    assert loose == {"base.html"}


def test_what_every_page_carries_is_used_somewhere() -> None:
    used = set().union(*(names_of_page(name) for name in TEMPLATES))
    assert SHARED - used == set()


ARITHMETIC = (nodes.Add, nodes.Sub, nodes.Mul, nodes.Div, nodes.FloorDiv, nodes.Mod, nodes.Pow)


@pytest.mark.parametrize("name", TEMPLATES)
def test_a_template_does_not_compute(name: str) -> None:
    found = [f"line {node.lineno}: {node.operator}" for node in parsed(name).find_all(ARITHMETIC)]
    assert found == [], "compute it in build(), or in the engine"


def _written(node: nodes.Node) -> str:
    """'ui.table' for the call of ui.table(...)."""
    if isinstance(node, nodes.Name):
        return node.name
    if isinstance(node, nodes.Getattr):
        return f"{_written(node.node)}.{node.attr}"
    return type(node).__name__


@pytest.mark.parametrize("name", TEMPLATES)
def test_a_template_calls_nothing_but_macros_and_the_catalogue(name: str) -> None:
    tree = parsed(name)
    allowed = {"_", "n_", "super", "caller"}
    allowed |= {macro.name for macro in tree.find_all(nodes.Macro)}
    called = {_written(call.node): call.lineno for call in tree.find_all(nodes.Call)}
    strange = {
        f"line {line}: {what}()"
        for what, line in called.items()
        if what not in allowed and not what.startswith(("ui.", "self."))
    }
    assert strange == set()
