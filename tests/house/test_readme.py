"""What README promises is what runs."""

import os
import re
import shlex
import subprocess
import sys
import tomllib
from itertools import chain
from pathlib import Path

import pytest

from tests.house.tree import ROOT

pytestmark = pytest.mark.house

README = (ROOT / "README.md").read_text(encoding="utf-8")


def commands() -> list[str]:
    """The lines of README that are set as commands."""
    return [line.strip() for line in README.splitlines() if line.startswith("    ")]


def test_there_are_two_commands() -> None:
    run, test = commands()
    assert run.endswith("ebbline demo")
    assert test.endswith("pytest -n auto")


def test_the_bare_machine_runs_the_same_test_command() -> None:
    lines = (ROOT / ".ci" / "run").read_text(encoding="utf-8").splitlines()
    assert lines[-1] == commands()[1]
    assert "export EBBLINE_REQUIRE_REAL=1" in lines


def test_every_dependency_is_pinned_without_an_address() -> None:
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    asked = [*project["dependencies"], *chain(*project["optional-dependencies"].values())]
    lines = (ROOT / ".ci" / "constraints.txt").read_text(encoding="utf-8").split()
    pinned = {line.partition("==")[0].lower().replace("_", "-") for line in lines}
    assert all(re.fullmatch(r"[\w.-]+==[\w.]+", line) for line in lines)
    names = {re.split(r"[\[<>=~ ]", one)[0].lower() for one in asked}
    assert names - pinned == set()


def test_the_example_with_real_counts_makes_an_edition(tmp_path: Path) -> None:
    example = re.search(r"```\n\.venv/bin/ebbline (.+?)```", README, re.DOTALL)
    assert example is not None
    words = shlex.split(example[1].replace("\\\n", " "))
    said = [
        subprocess.run(
            [sys.executable, "-m", "server", *arguments],
            cwd=ROOT,
            env={**os.environ, "EBBLINE_DATA": str(tmp_path)},
            capture_output=True,
            text=True,
        )
        for arguments in (["database"], words)
    ]
    assert [one.returncode for one in said] == [0, 0], said[-1].stderr
    assert "edition 1" in said[-1].stdout.lower()


def test_pictures_and_links_of_the_documents_exist() -> None:
    for name in ("README.md", "DEVELOPERS.md"):
        text = (ROOT / name).read_text(encoding="utf-8")
        linked = re.findall(r"\]\(([^)#:]+)\)", text)
        assert [path for path in linked if not (ROOT / path).exists()] == []


def test_files_named_in_developers_exist() -> None:
    text = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
    named = re.findall(r"\b((?:server|engine|tests|seed_scenarios|templates)/[\w/]+\.\w+)", text)
    assert len(named) >= 10
    assert [path for path in named if not (ROOT / path).exists()] == []
