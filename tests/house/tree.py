"""The files of the project, as the house tests walk them."""

import os
from collections.abc import Iterator
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
ROOMS = ("server", "engine", "templates", "static", "migrations", "tests", "seed_scenarios")
_MADE = {"__pycache__", "node_modules"}  # by tools, never kept


def files(*folders: str, suffix: str = "") -> Iterator[Path]:
    """Files under these folders of the project whose name ends so, in order of path."""
    for folder in folders or ROOMS:
        for place, inner, names in os.walk(ROOT / folder):
            inner[:] = sorted(name for name in inner if name not in _MADE)
            for name in sorted(names):
                if name.endswith(suffix):
                    yield Path(place) / name


def texts() -> Iterator[tuple[str, str]]:
    """Path and text of everything people of this project wrote; vendored files are others' work."""
    written = (".py", ".html", ".css", ".js", ".toml", ".md", ".json", ".svg", ".txt", ".csv", "")
    outside = ("static/vendor/", "static/fonts/", "tests/published/", "tests/browser/axe/")
    loose = (ROOT / name for name in ("README.md", "DEVELOPERS.md", "pyproject.toml", ".gitignore"))
    for path in (*files(), *files(".ci"), *(path for path in loose if path.exists())):
        short = path.relative_to(ROOT).as_posix()
        if path.suffix in written and not short.startswith(outside):
            yield short, path.read_text(encoding="utf-8", errors=_errors(short))


def _errors(short: str) -> str:
    """The ugly tables are in other encodings on purpose; everything else is UTF-8."""
    return "replace" if short.startswith("tests/ugly/") else "strict"
