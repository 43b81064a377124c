"""The settings of one running Ebbline, read once from the environment."""

import os
from dataclasses import dataclass, field
from pathlib import Path


def _described(default: object, text: str) -> object:
    return field(default=default, metadata={"text": text})


@dataclass(frozen=True, slots=True)
class Config:
    """Every field can be set by the environment variable EBBLINE_ and its name in capitals."""

    data: Path = _described(Path("data"), "folder in which the database lives")  # type: ignore[assignment]
    database_url: str = _described(  # type: ignore[assignment]
        "", "database address; empty means the SQLite file ebbline.db in the data folder"
    )
    host: str = _described("127.0.0.1", "address to serve on")  # type: ignore[assignment]
    port: int = _described(8000, "port to serve on")  # type: ignore[assignment]
    upload_limit: int = _described(  # type: ignore[assignment]
        60_000_000, "largest upload, bytes"
    )
    language: str = _described("en", "language of the pages")  # type: ignore[assignment]

    @classmethod
    def from_environment(cls, environment: "dict[str, str] | None" = None) -> "Config":
        """Read the variables; ValueError names the one that cannot be read and what it should be."""
        given = dict(os.environ if environment is None else environment)
        values: dict[str, object] = {}
        for name, kind in (
            ("data", Path),
            ("database_url", str),
            ("host", str),
            ("port", int),
            ("upload_limit", int),
            ("language", str),
        ):
            text = given.get(f"EBBLINE_{name.upper()}")
            if text is None:
                continue
            try:
                values[name] = kind(text)
            except ValueError as error:
                raise ValueError(
                    f"EBBLINE_{name.upper()} is {text!r}; it must be a whole number"
                ) from error
        return cls(**values)  # type: ignore[arg-type]

    @property
    def url(self) -> str:
        """The database address in force."""
        return self.database_url or f"sqlite:///{(self.data / 'ebbline.db').resolve()}"
