"""Types, strictly."""

import subprocess
import sys

import pytest

from tests.house.tree import ROOT

pytestmark = [pytest.mark.house, pytest.mark.slow]


def test_mypy_has_nothing_to_say() -> None:
    said = subprocess.run([sys.executable, "-m", "mypy"], cwd=ROOT, capture_output=True, text=True)
    assert said.returncode == 0, said.stdout + said.stderr
