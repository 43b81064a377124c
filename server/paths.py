"""Where the folders of templates, static files and migrations are: inside the installed package, or
beside it in a checkout."""

from pathlib import Path

_HERE = Path(__file__).resolve().parent


def folder(name: str) -> Path:
    """The data folder of this name; FileNotFoundError where it is in neither place."""
    for base in (_HERE, _HERE.parent):
        if (base / name).is_dir():
            return base / name
    raise FileNotFoundError(f"folder {name!r} is missing in and beside {_HERE}; install again")
