"""Arrows between rooms point one way; the contracts stand in pyproject.toml."""

import subprocess
import sys
from pathlib import Path

import pytest

from tests.house.tree import ROOT

pytestmark = pytest.mark.house


def test_every_import_contract_is_kept() -> None:
    command = Path(sys.executable).with_name("lint-imports")
    said = subprocess.run([command, "--no-cache"], cwd=ROOT, capture_output=True, text=True)
    assert said.returncode == 0, said.stdout + said.stderr
    assert "0 broken" in said.stdout
