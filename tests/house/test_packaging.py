"""What is installed holds all that runs: packages, and the folders the program looks for inside."""

import re
import tomllib

import pytest

from tests.house.tree import ROOMS, ROOT, files

pytestmark = pytest.mark.house

WHEEL = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["tool"]["hatch"][
    "build"
]["targets"]["wheel"]


def test_every_room_but_the_tests_is_installed() -> None:
    assert {*WHEEL["packages"], *WHEEL["force-include"]} == {*ROOMS} - {"tests"}


def test_folders_the_program_looks_for_lie_inside_it() -> None:
    code = "\n".join(path.read_text(encoding="utf-8") for path in files("server", suffix=".py"))
    sought = set(re.findall(r'\bfolder\("(\w+)"\)', code))
    assert {"templates", "static", "migrations"} <= sought
    assert {name: WHEEL["force-include"][name] for name in sought} == {
        name: f"server/{name}" for name in sought
    }
