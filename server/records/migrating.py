"""Bringing a database to the newest migration."""

from dataclasses import dataclass

from alembic import command
from alembic.config import Config
from alembic.runtime.migration import MigrationContext
from alembic.script import ScriptDirectory
from sqlalchemy import Connection

from server.files import find_folder
from server.records.database import Database


@dataclass(frozen=True, slots=True)
class MigrationReport:
    """From where to where a database was brought; equal where nothing was to do."""

    before: str | None
    after: str | None


class ForeignKeysBroken(Exception):
    """A migration left rows that point nowhere; nothing of it is kept."""


def migrate(database: Database) -> MigrationReport:
    """Bring a database to the newest migration, in one transaction.

    On SQLite foreign keys are off meanwhile (a batch rebuild would empty child tables) and checked
    before the commit.
    """
    with database.engine.connect() as connection:
        if database.is_sqlite:
            connection.connection.execute("PRAGMA foreign_keys = OFF")
        try:
            with connection.begin():
                before = _revision(connection)
                command.upgrade(_config(connection), "head")
                after = _revision(connection)
                if database.is_sqlite:
                    _check_foreign_keys(connection)
        finally:
            if database.is_sqlite:
                connection.connection.execute("PRAGMA foreign_keys = ON")
    return MigrationReport(before, after)


def newest() -> str | None:
    """Return the newest migration that this program knows."""
    return ScriptDirectory.from_config(_config(None)).get_current_head()


def current(database: Database) -> str | None:
    """Return the migration that a database is at, None where it is empty."""
    with database.reader.connect() as connection:
        return _revision(connection)


def _revision(connection: Connection) -> str | None:
    return MigrationContext.configure(connection).get_current_revision()


def _config(connection: Connection | None) -> Config:
    config = Config()
    config.set_main_option("script_location", str(find_folder("migrations")).replace("%", "%%"))
    config.set_main_option("path_separator", "os")
    if connection is not None:
        config.attributes["connection"] = connection
    return config


def _check_foreign_keys(connection: Connection) -> None:
    broken = connection.exec_driver_sql("PRAGMA foreign_key_check").fetchall()
    if broken:
        says = f"{len(broken)} rows of {broken[0][0]} and others would point nowhere."
        raise ForeignKeysBroken(says)
