"""One style, checked by ruff."""

import subprocess
import sys

import pytest

from tests.house.tree import ROOT

pytestmark = pytest.mark.house


@pytest.mark.parametrize("command", [["check"], ["format", "--check"]], ids=" ".join)
def test_ruff_has_nothing_to_say(command: list[str]) -> None:
    said = subprocess.run(
        [sys.executable, "-m", "ruff", *command, "."], cwd=ROOT, capture_output=True, text=True
    )
    assert said.returncode == 0, said.stdout + said.stderr
