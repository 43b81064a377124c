"""The command line on a database of its own."""

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest

from server.cli import main


@dataclass(frozen=True, slots=True)
class Said:
    """How a command ended and what it printed."""

    code: int
    out: str
    err: str


Ebbline = Callable[..., Said]


@pytest.fixture
def ebbline(
    sqlite_url: str, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> Ebbline:
    """Runs one command, as typed."""
    monkeypatch.setenv("EBBLINE_DATABASE_URL", sqlite_url)

    def run(*words: str | Path) -> Said:
        capsys.readouterr()
        code = main([str(word) for word in words])
        return Said(code, *capsys.readouterr())

    return run
