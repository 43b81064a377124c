"""Copies of the demonstration's first two editions, to do things to."""

import shutil
from collections.abc import Callable
from pathlib import Path

import pytest


@pytest.fixture(scope="module")
def copied(delivered: Path, tmp_path_factory: pytest.TempPathFactory) -> Callable[[], Path]:
    """Makes a data folder of one's own."""
    return lambda: shutil.copytree(delivered, tmp_path_factory.mktemp("copy") / "data")


@pytest.fixture(scope="module")
def island(copied: Callable[[], Path]) -> Path:
    """A data folder for the tests of one file."""
    return copied()
