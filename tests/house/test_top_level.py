"""The top level holds the agreed names and nothing else."""

import pytest

from tests.house.tree import ROOMS, ROOT

pytestmark = pytest.mark.house

AGREED = {"README.md", "DEVELOPERS.md", "pyproject.toml", *ROOMS}


def _made_here() -> set[str]:
    """What running and building leave behind: the plain folder names of .gitignore."""
    lines = (ROOT / ".gitignore").read_text(encoding="utf-8").split()
    return {line.rstrip("/") for line in lines if not line.startswith(("*", "."))}


def test_nothing_new_stands_at_the_top() -> None:
    found = {path.name for path in ROOT.iterdir() if not path.name.startswith(".")}
    strange = {
        name for name in found - AGREED - _made_here() if not name.endswith((".egg-info", ".pyc"))
    }
    assert strange == {"__pycache__"} & strange, f"put these into a room: {sorted(strange)}"


def test_everything_agreed_is_there() -> None:
    missing = {name for name in AGREED if not (ROOT / name).exists()}
    assert missing == set()
