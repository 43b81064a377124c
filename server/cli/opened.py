"""The database a command works on."""

from collections.abc import Iterator
from contextlib import contextmanager

from server.cli.refusals import Declined
from server.config import Config
from server.sentences.text import _
from server.store.connect import Session, make_engine, sessions
from server.store.migrating import schema_state


def found(config: Config) -> tuple[str, str]:
    """State of the schema (head, behind, empty), and where it is, without a password. To look makes
    no file. Declined where a newer program made it."""
    if not config.database_url and not config.file.exists():
        return "empty", config.url
    engine = make_engine(config.url)
    state, place = schema_state(engine), str(engine.url)
    engine.dispose()
    if state == "ahead":
        raise Declined(
            _(
                "The database at {url} was made by a newer version than this one. Install that "
                "version, or name another folder with --data.",
                url=place,
            ),
            exit_code=1,
        )
    return state, place


def require_head(config: Config) -> None:
    """Refuse where the database is not in the shape this version needs."""
    state, place = found(config)
    if state == "empty":
        raise Declined(
            _("There is no database yet at {url}. Make it: ebbline database", url=place),
            exit_code=1,
        )
    if state != "head":
        raise Declined(
            _(
                "The database at {url} was made by an older version. Bring it up to date: ebbline "
                "database",
                url=place,
            ),
            exit_code=1,
        )


@contextmanager
def opened(config: Config) -> Iterator[Session]:
    """A session on the database, which must be up to date."""
    require_head(config)
    engine = make_engine(config.url)
    try:
        with sessions(engine)() as session:
            yield session
    finally:
        engine.dispose()
