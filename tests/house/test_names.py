"""Names that could mean anything mean nothing; the field has its own words."""

import ast
import re

import pytest

from tests.house.tree import ROOT, files

pytestmark = pytest.mark.house

BANNED = {"util", "utils", "helper", "helpers", "common", "misc", "manager", "data", "info"}
BANNED |= {"process"}


def _words(name: str) -> set[str]:
    """'TableManager' and 'table_manager' -> {'table', 'manager'}."""
    return set(re.sub(r"(?<=[a-z])(?=[A-Z])", "_", name).lower().split("_"))


def test_no_file_or_folder_has_a_name_without_a_subject() -> None:
    inside = ("server", "engine", "templates", "migrations", "tests", "seed_scenarios")
    named = {path.relative_to(ROOT) for path in files(*inside)}
    bad = {
        path.as_posix()
        for path in named
        if any(_words(part.split(".")[0]) & BANNED for part in path.parts)
    }
    assert bad == set(), "name the subject, not the habit"


def test_no_class_has_one_either() -> None:
    bad = set()
    for path in files("server", "engine", "seed_scenarios", suffix=".py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if isinstance(node, ast.ClassDef) and _words(node.name) & BANNED:
                bad.add(f"{path.relative_to(ROOT)}:{node.lineno} {node.name}")
    assert bad == set(), "name the subject, not the habit"
