"""The demonstration collection, built once, and copies of it to do things to."""

import shutil
from collections.abc import Callable
from pathlib import Path

import pytest

from seed_scenarios import quillmere
from server.config import Config
from server.store.migrating import migrate
from tests.server.promises.island import NOW, writing


@pytest.fixture(scope="session")
def built(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A data folder in which the demonstration was loaded; to be copied, not changed."""
    folder = tmp_path_factory.mktemp("quillmere")
    migrate(Config(data=folder).url)
    with writing(folder) as session:
        quillmere.deliver(session, now=NOW)
    return folder


@pytest.fixture(scope="module")
def copied(built: Path, tmp_path_factory: pytest.TempPathFactory) -> Callable[[], Path]:
    """Makes a data folder of one's own."""
    return lambda: shutil.copytree(built, tmp_path_factory.mktemp("copy") / "data")


@pytest.fixture(scope="module")
def island(copied: Callable[[], Path]) -> Path:
    """A data folder for the tests of one file."""
    return copied()
