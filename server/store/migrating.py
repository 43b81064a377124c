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


def schema_state(engine: Engine) -> Literal["head", "behind", "ahead", "empty"]:
    """Where the schema stands; 'ahead' is one of a newer program, which this one does not know.

    Raises: Unreachable where there is no database at the address, or no answer from it.
    """
    try:
        with engine.connect() as connection:
            at = MigrationContext.configure(connection).get_current_revision()
    except DBAPIError as error:
        raise Unreachable(str(engine.url), error.orig) from error
    if at is None:
        return "empty"
    scripts = ScriptDirectory.from_config(configuration(""))
    if at == scripts.get_current_head():
        return "head"
    return "behind" if at in {one.revision for one in scripts.walk_revisions()} else "ahead"


def configuration(url: str) -> Config:
    """Alembic's settings for this database, without a file."""
    settings = Config()
    settings.set_main_option("script_location", str(folder("migrations")).replace("%", "%%"))
    settings.attributes["url"] = url
    return settings
