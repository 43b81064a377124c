"""Bringing a database to the newest schema, and telling where it is."""

from typing import Literal

from alembic import command
from alembic.config import Config
from alembic.runtime.migration import MigrationContext
from alembic.script import ScriptDirectory
from sqlalchemy import Engine
from sqlalchemy.exc import DBAPIError

from server.paths import folder
from server.store.errors import Unreachable


def migrate(url: str) -> None:
    """Bring the database to the newest schema; an empty one is filled."""
    command.upgrade(configuration(url), "head")


def schema_state(engine: Engine) -> Literal["head", "behind", "empty"]:
    """Where the schema stands. One from a newer program counts as 'behind': it is not served.

    Raises: Unreachable where there is no database at the address, or no answer from it.
    """
    try:
        with engine.connect() as connection:
            at = MigrationContext.configure(connection).get_current_revision()
    except DBAPIError as error:
        raise Unreachable(str(engine.url), error.orig) from error
    if at is None:
        return "empty"
    head = ScriptDirectory.from_config(configuration("")).get_current_head()
    return "head" if at == head else "behind"


def configuration(url: str) -> Config:
    """Alembic's settings for this database, without a file."""
    settings = Config()
    settings.set_main_option("script_location", str(folder("migrations")).replace("%", "%%"))
    settings.attributes["url"] = url
    return settings
