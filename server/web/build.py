"""Which Ebbline this is: its version, and a digest of everything that can move a byte of a page."""

import hashlib
import platform
from collections.abc import Iterable
from dataclasses import dataclass
from functools import cache
from importlib.metadata import version
from pathlib import Path

import engine
import server
from server.paths import folder

TAKE_PART = (
    "numpy",
    "scipy",
    "pandas",
    "sqlalchemy",
    "fastapi",
    "starlette",
    "jinja2",
    "markupsafe",
    "orjson",
    "openpyxl",
)
_WRITTEN = (".py", ".json", ".csv", ".txt")  # of the packages: code and printed constants


@dataclass(frozen=True, slots=True)
class Build:
    version: str
    digest: str  # engine, server, templates, static files and the versions of what they import
    static: str  # static files alone: stands in their addresses

    @property
    def short(self) -> str:
        return self.digest[:6]


@cache
def build() -> Build:
    """The build that runs; the same in every process of one installation."""
    packages = [Path(package.__path__[0]) for package in (engine, server)]
    code = _digest([*packages, folder("templates")])
    static = _digest([folder("static")], every=True)
    whole = hashlib.sha256("\n".join([code, static, *_imported()]).encode()).hexdigest()
    return Build(engine.VERSION, whole, static[:12])


def _digest(roots: Iterable[Path], *, every: bool = False) -> str:
    found = hashlib.sha256()
    for root in roots:
        for path in sorted(root.rglob("*")):
            kept = every or path.suffix in (*_WRITTEN, ".html")
            if path.is_file() and kept and "__pycache__" not in path.parts:
                found.update(f"{root.name}/{path.relative_to(root).as_posix()}\n".encode())
                found.update(hashlib.sha256(path.read_bytes()).digest())
    return found.hexdigest()


def _imported() -> list[str]:
    """Python and the packages that take part in a page, in the versions that are installed."""
    return [
        f"python {platform.python_version()}",
        *(f"{name} {version(name)}" for name in TAKE_PART),
    ]
