"""All texts of the catalogue; python -m tests.house.catalogue es: those that a language lacks.

Texts stand in calls of `_` and `n_`, in templates, in what the store and the routes refuse, and in
the registries: indicators, settings, checks, cause lists.
"""

import ast
import json
import sys
from collections.abc import Iterable, Iterator
from dataclasses import fields, is_dataclass
from pathlib import Path

import jinja2
from jinja2 import nodes

from engine.causes.registry import NUMBERS
from engine.indicators import GROUPS
from engine.settings import SETTINGS
from server.intake.causes.lists import BUILT_IN as CAUSE_LISTS
from server.intake.checks import CHAPTERS, KINDS
from server.results.targets import TARGETS
from server.sentences.languages import texts
from server.sentences.names import brief

ROOMS = ("server", "engine")
CALLS = {"_": 1, "n_": 2, "translate": 1, "Text": 1}  # how many of their first arguments are texts
# fields of registries that are read by people; others are keys, codes and calculations. A source
# stands as it was published
READ = {
    "label",
    "question",
    "definition",
    "formula",
    "why_not_smooth",
    "name",
    "sentence",
    "standard",
    "title",
    "about",
    "meaning",
    "why",
    "remedy",
    "found",
    "expected",
}


def everywhere() -> dict[str, str]:
    """Every text that can be listed, and where it stands."""
    found: dict[str, str] = {}
    for room in ROOMS:
        for path in sorted(Path(room).rglob("*.py")):
            found |= dict.fromkeys(_of_code(ast.parse(path.read_text(encoding="utf-8"))), str(path))
    for path in sorted(Path("templates").rglob("*.html")):
        found |= dict.fromkeys(_of_template(path.read_text(encoding="utf-8")), str(path))
    found |= dict.fromkeys(_of_registries(), "a registry")
    return {text: place for text, place in found.items() if any(map(str.isalpha, text))}


def _of_code(tree: ast.AST) -> Iterator[str]:
    """Texts of calls; and, with a blank in them, those of refusals, which whoever shows them passes
    through the catalogue."""
    raised = {id(node.exc) for node in ast.walk(tree) if isinstance(node, ast.Raise)}
    for node in ast.walk(tree):
        if not isinstance(node, ast.Call):
            continue
        name = node.func.id if isinstance(node.func, ast.Name) else ""
        for argument in node.args[: CALLS.get(name, 0)]:
            yield from _constants(argument)
        refusal = id(node) in raised and name not in BUILT_IN
        if refusal or (isinstance(node.func, ast.Attribute) and node.func.attr == "__init__"):
            yield from (text for one in node.args for text in _constants(one) if " " in text)


BUILT_IN = ("ValueError", "TypeError", "KeyError", "LookupError", "RuntimeError", "AssertionError")


def _constants(node: ast.AST) -> Iterator[str]:
    if isinstance(node, ast.Call | ast.Subscript | ast.Dict):
        return  # a text looked up or made: the walk through the pages finds it
    if isinstance(node, ast.Constant) and isinstance(node.value, str):
        yield node.value
    for child in ast.iter_child_nodes(node):
        yield from _constants(child)


def _of_template(source: str) -> Iterator[str]:
    for call in jinja2.Environment().parse(source).find_all(nodes.Call):
        if isinstance(call.node, nodes.Name):
            for argument in call.args[: CALLS.get(call.node.name, 0)]:
                if isinstance(argument, nodes.Const):
                    yield argument.value


REGISTRIES = (
    GROUPS,
    NUMBERS.values(),
    SETTINGS.values(),
    CHAPTERS,
    KINDS.values(),
    CAUSE_LISTS.values(),
    TARGETS,
)


def _of_registries() -> Iterator[str]:
    for registry in REGISTRIES:
        yield from _read(registry)
    for settings in SETTINGS.values():
        yield from _read(settings.stages)
    for group in GROUPS:
        yield from (brief(one.label) for one in group.indicators)


def _read(value: object) -> Iterator[str]:
    """Texts in fields that are read, however deep."""
    if is_dataclass(value) and not isinstance(value, type):
        for field in fields(value):
            part = getattr(value, field.name)
            if isinstance(part, str):
                if field.name in READ and part:
                    yield part
            else:
                yield from _read(part)
    elif isinstance(value, Iterable) and not isinstance(value, str | bytes):
        for part in value:
            yield from _read(part)


def lacking(code: str) -> list[str]:
    own = texts(code)
    return [text for text in everywhere() if text not in own]


if __name__ == "__main__":
    json.dump(lacking(sys.argv[1]), sys.stdout, ensure_ascii=False, indent=1)
