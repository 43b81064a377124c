"""The settings of one running Ebbline, read once from the environment."""

import os
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path

# variable (after EBBLINE_) -> how to read it, and what it is
VARIABLES: dict[str, tuple[Callable[[str], object], str]] = {
    "data": (Path, "folder in which the database lives"),
    "database_url": (str, "database address; empty means the SQLite file in the data folder"),
    "host": (str, "address to serve on"),
    "port": (int, "port to serve on"),
    "upload_limit": (int, "largest upload, bytes"),
    "language": (str, "language of the pages"),
    "help_line": (str, "where readers of pages on suicide, overdose or violence find help"),
    "work_seconds": (int, "longest time that reading and checking an upload may take, seconds"),
    "work_megabytes": (int, "most memory that reading and checking an upload may take, MB"),
}


@dataclass(frozen=True, slots=True)
class Config:
    """Every field can be set by the environment variable EBBLINE_ and its name in capitals."""

    data: Path = Path("data")
    database_url: str = ""
    host: str = "127.0.0.1"
    port: int = 8000
    upload_limit: int = 60_000_000
    language: str = "en"
    help_line: str = ""
    work_seconds: int = 600
    work_megabytes: int = 2_000

    @classmethod
    def from_environment(cls, environment: Mapping[str, str] = os.environ) -> "Config":
        """Read the variables; ValueError names one that cannot be read and what it should be."""
        values: dict[str, object] = {}
        for name, (kind, text) in VARIABLES.items():
            variable = f"EBBLINE_{name.upper()}"
            if variable not in environment:
                continue
            try:
                values[name] = kind(environment[variable])
            except ValueError as error:
                raise ValueError(
                    f"{variable} ({text}) is {environment[variable]!r}; expected a whole number"
                ) from error
        return cls(**values)  # type: ignore[arg-type]

    @property
    def file(self) -> Path:
        """Where the database lives, unless it has an address of its own."""
        return self.data / "ebbline.db"

    @property
    def url(self) -> str:
        """The database address in force."""
        return self.database_url or f"sqlite:///{self.file.resolve()}"
